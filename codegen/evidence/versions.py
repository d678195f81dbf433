"""What made the C: this tool, the Python that ran it, and the packages that it rests on."""

from __future__ import annotations

import platform
from importlib.metadata import version

from codegen import VERSION

DEPENDENCIES = ("cffi", "jinja2", "mpmath", "numpy", "typer")


def dependency_versions() -> dict[str, str]:
    """Names and versions, sorted after the tool itself."""
    return {
        "linkwright": VERSION,
        "python": platform.python_version(),
        **{name: version(name) for name in DEPENDENCIES},
    }
