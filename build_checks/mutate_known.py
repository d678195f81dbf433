"""Changes of the generated C that are no faults: each with the reason why."""

from __future__ import annotations

import re
from dataclasses import dataclass

from build_checks.mutate_kinds import Kind, Mutant


@dataclass(frozen=True, slots=True)
class Known:
    """Mutants of one kind on lines that match `line` in functions whose name ends with `function`.

    before  what the fault replaces
    """

    kinds: tuple[Kind, ...]
    function: str
    line: str
    before: str
    reason: str


KNOWN: tuple[Known, ...] = ()


def why_equivalent(mutant: Mutant, line: str) -> str:
    """The recorded reason, or ""."""
    for row in KNOWN:
        if (
            mutant.kind in row.kinds
            and re.search(row.function, mutant.function)
            and re.search(row.line, line)
            and re.search(row.before, mutant.before)
        ):
            return row.reason
    return ""
