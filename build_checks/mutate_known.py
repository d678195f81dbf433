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


KNOWN: tuple[Known, ...] = (
    Known(
        (Kind.BRANCH,),
        r"_branch_of$",
        r"_all_usable\(q\)",
        "",
        "the interface names no branch for joint values that are none; that the C does is asked for by the fuzz target",
    ),
    Known(
        (Kind.BRANCH,),
        r"_far_turn$",
        r"exponent >= 184u",
        "",
        "beyond 2^57 rad no digit of an angle is below a turn, so any turn is right; a sanitizer sees the wide shift",
    ),
    Known(
        (Kind.INTEGER,),
        r"_far_turn$",
        r"0x4E44152Au\) >> 32",
        "",
        "these digits count from thousands of turns on, where a joint with limits never is; without limits it goes there",
    ),
    Known(
        (Kind.STATEMENT,),
        r"_take_pose$",
        r"marks = MARK_OUT_OF_REACH;",
        "",
        "a position so far out is out of reach on every branch: the mark saves the work of finding that out",
    ),
    Known(
        (Kind.SEED, Kind.INDEX, Kind.SIGN),
        r"_stage_0$",
        r"heading = \w+_turn\(work->seed",
        "",
        "a pose that states no heading may be solved with any: that of the seed is a courtesy",
    ),
    Known(
        (Kind.CONSTANT,),
        r"_clean_rotation$",
        r"\* given\[",
        "",
        "the rotation is brought to the nearest true one, which a common factor of all entries does not change",
    ),
)


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
