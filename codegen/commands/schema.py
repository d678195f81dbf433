"""`linkwright schema`: the JSON Schema of the arm file."""

from __future__ import annotations

from codegen.commands.console import show_data


def schema() -> None:
    """Print the JSON Schema of the arm file.

    Editors use it to check and complete while you type.

    \b
    Example:
      linkwright schema > arm.schema.json
    """
    import json

    from codegen.schema import arm_file_schema

    show_data(json.dumps(arm_file_schema(), indent=2) + "\n")
