"""Code that the agreement vectors do not reach, each with the reason why nothing can, or why it stands there."""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Known:
    """Lines that match `code` in functions whose name ends with `function`, in the C of the arms named; none: of all."""

    function: str
    code: str
    reason: str
    arms: frozenset[str] = frozenset()


_LINKS_DIFFER = frozenset({"bench_six", "vial_picker", "tray_scara", "press_tender"})

KNOWN = (
    Known(
        r"_stage_\d",
        r"signed_root\(work, known->\w+_square, SLACK, 0\.0f?, second|^return false;  /\* out of reach \*/$",
        "one less the square of an entry of a true rotation is not negative but for rounding",
    ),
    Known(
        r"_branches_\d",
        r"if \(\w+_stage_\d\(|^continue;$",
        "the wrist of bench_six, and the waist of vial_picker, has its roots for every pose that gets that far",
        frozenset({"bench_six", "vial_picker"}),
    ),
    Known(
        r"_stage_\d",
        r"arm_unit\(.*shoulder_from_|shoulder = arm_turn\(work->q|marks \|= MARK_FREE|keep_free\(work, [01]u\)",
        "the links differ in length, so the wrist never comes to stand on the shoulder",
        _LINKS_DIFFER,
    ),
    Known(
        r"_keep_free",
        r"",
        "the links differ in length, so no pose leaves a joint free",
        frozenset({"tray_scara"}),
    ),
    Known(
        r"_stage_1",
        r"exceeds\(known->waist_size|abs\(-D2\) > LEAST_LENGTH|waist = arm_turn\(work->q",
        "the shoulder's offset keeps the wrist's centre away from the waist's axis; no vector asks for a pose just there",
        frozenset({"bench_six"}),
    ),
    Known(
        r"_stage_1",
        r"signed_root\(work, known->waist_square, SLACK \* known->waist_square",
        "the square is that of the distance from the waist's axis, which is not negative",
        frozenset({"vial_picker"}),
    ),
    Known(
        r"_settle_turns",
        r"if \(\(joints & 0x\w+u\) != 0u\) \{",
        "the joints of the last stage are found anew for every solution, and no pose leaves one of them free",
        frozenset({"bench_six", "vial_picker", "tray_scara"}),
    ),
    Known(
        r"_settle_far",
        r"exceeds\(value, range->upper\)",
        "the limits lie evenly about zero: a turn within them has been found before",
        frozenset({"tray_scara"}),
    ),
    Known(
        r"_signed_root",
        r"exceeds\(square, flat\)",
        "the rounded square goes up in steps, of which the first above zero is already larger, by less than its rounding",
        frozenset({"tray_scara", "vial_picker"}),
    ),
    Known(
        r"_near_turn",
        r"for \(int pass = 0; pass < 5; \+\+pass\)",
        "four passes take off all 52 binary digits above 2^16, so that the fifth breaks off",
    ),
    Known(
        r"_reached",
        r"return length_good && angle_good;",
        "a root that is clamped there is one of lengths: the wrist then takes up the whole rotation",
        frozenset({"bench_six"}),
    ),
)


def why_unreached(arm: str, function: str, code: str) -> str:
    """The recorded reason, or ""."""
    for row in KNOWN:
        here = not row.arms or arm in row.arms
        if here and re.search(f"{row.function}$", function) and re.search(row.code, code):
            return row.reason
    return ""
