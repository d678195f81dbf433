"""Code that the agreement vectors do not reach, each with the reason."""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Known:
    """Lines that match `code` in functions whose name ends with `function`."""

    function: str
    code: str
    reason: str


KNOWN: tuple[Known, ...] = ()


def why_unreached(function: str, code: str, way: int) -> str:
    """The recorded reason, or ""."""
    for row in KNOWN:
        if re.search(f"{row.function}$", function) and re.search(row.code, code):
            return row.reason
    return ""
