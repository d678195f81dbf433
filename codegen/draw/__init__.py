"""A picture of an arm: three views at chosen joint values, the link table, and on demand the reachable region.

matplotlib draws it; it is an optional extra, so it is only imported when a picture is asked for. The same arm file
gives the same bytes: no date, no random identifiers, a font that comes with matplotlib.
"""

from __future__ import annotations

import importlib.util
import math
from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from codegen.draw.units import in_file_units, is_angle, number, unit_size
from codegen.errors import CallError, Fault
from codegen.link_product import Floats, quantity_value
from codegen.model import Arm, JointRow
from codegen.writing import write_file

FORMATS = {".pdf": "pdf", ".png": "png", ".svg": "svg"}

Positions = Callable[[Floats], Floats]  # joint vectors (N, n), rad and m -> tool points (N, 3), m


def draw(
    arm: Arm, out: Path, at: Sequence[float] | None = None, reach: bool = False, positions: Positions | None = None
) -> tuple[str, ...]:
    """Writes the picture to `out`, as .svg, .png or .pdf; returns notes for the user.

    at         joint values, rad and m; None: `resting_values`
    reach      adds the region that the tool point can reach within limits
    positions  forward kinematics to sample the region with (the generated C, say); None: the link table's own product
    Raises CallError without matplotlib, for another suffix, for a wrong number of joint values, and for a path that
    cannot be written.
    """
    picture_format = _format(out)
    require_matplotlib()
    from codegen.draw.page import page_bytes

    q = np.array(resting_values(arm) if at is None else list(at), dtype=np.float64)
    _require_count(arm, len(q))
    content, notes = page_bytes(arm, q, picture_format, reach, positions)
    write_file(out, content)
    return (*limit_notes(arm, q), *notes)


def require_matplotlib() -> None:
    if importlib.util.find_spec("matplotlib") is None:
        hint = 'install it with: pip install "linkwright[draw]"'
        raise CallError(Fault("draw", "pictures need matplotlib, which is not installed", hint))


def _format(out: Path) -> str:
    found = FORMATS.get(out.suffix.lower())
    if found is None:
        what = f'"{out.suffix}" is no format of a picture' if out.suffix else "has no suffix to tell the format by"
        raise CallError(Fault(str(out), what, f"end it in {', '.join(sorted(FORMATS))}"))
    return found


def resting_values(arm: Arm) -> list[float]:
    """For a turning joint zero, or the nearest angle that its limits allow; for a slide the middle of its travel."""
    return [_resting_value(row) for row in arm.joints]


def _resting_value(row: JointRow) -> float:
    if row.limits is None:
        return 0.0
    lower, upper = map(quantity_value, row.limits)
    return min(max(0.0, lower), upper) if is_angle(row) else (lower + upper) / 2


def _require_count(arm: Arm, count: int) -> None:
    if count != len(arm.joints):
        names = ", ".join(row.name for row in arm.joints)
        what = f"{count} joint values, and the arm has {len(arm.joints)} joints ({names})"
        raise CallError(Fault("--at", what, "give one for each, base first, with commas between"))


def joint_values(arm: Arm, text: str) -> list[float]:
    """Joint values typed in the file's units, with commas between, as rad and m."""
    words = [word.strip() for word in text.split(",")]
    _require_count(arm, len(words) if text.strip() else 0)
    return [_joint_value(arm, index, word) for index, word in enumerate(words)]


def _joint_value(arm: Arm, index: int, word: str) -> float:
    row = arm.joints[index]
    unit = arm.angle_unit if is_angle(row) else arm.length_unit
    try:
        value = float(word)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        where = f'--at: joint {index + 1} ("{row.name}")'
        raise CallError(Fault(where, f'"{word}" is no finite number', f"give its value in {unit}"))
    return value * unit_size(arm, is_angle(row))


def limit_notes(arm: Arm, q: Floats) -> list[str]:
    """Which joints are drawn beyond their limits."""
    notes = []
    for row, value in zip(arm.joints, q, strict=True):
        if (
            row.limits is None
            or quantity_value(row.limits[0]) - 1e-12 <= value <= quantity_value(row.limits[1]) + 1e-12
        ):
            continue
        shown = number(value / unit_size(arm, is_angle(row)))
        lower, upper = (in_file_units(arm, end) for end in row.limits)
        notes.append(f'joint "{row.name}" is drawn at {shown}, outside its limits {lower} to {upper}')
    return notes
