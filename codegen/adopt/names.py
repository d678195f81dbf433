"""Names of a description made fit for an arm file, which is stricter: its names reach the C."""

from __future__ import annotations

import re
from collections.abc import Sequence

from codegen.armfile_keys import LONGEST_NAME
from codegen.armfile_names import identifier_problem, label_problem


def arm_identifier(robot: str) -> str:
    """A C identifier made of a robot's name."""
    plain = re.sub(r"[^0-9A-Za-z]+", "_", robot).strip("_")[:LONGEST_NAME].strip("_")
    if not plain:
        return "arm"
    return plain if identifier_problem(plain) == ("", "") else f"arm_{plain}"[:LONGEST_NAME].strip("_")


def joint_labels(names: Sequence[str]) -> tuple[str, ...]:
    """The joints' own names where the arm file can hold them, all different."""
    labels: list[str] = []
    for number, name in enumerate(names, start=1):
        label = name if label_problem(name) == ("", "") else _plain(name) or f"joint{number}"
        labels.append(label if label not in labels else f"{label[: LONGEST_NAME - 3]}_{number}")
    return tuple(labels)


def _plain(name: str) -> str:
    return re.sub(r"[^0-9A-Za-z_]+", "_", name).strip("_")[:LONGEST_NAME].strip("_")
