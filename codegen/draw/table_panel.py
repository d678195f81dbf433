"""The link table under the picture, so that every symbol of the picture has its number beside it."""

from __future__ import annotations

from matplotlib.axes import Axes

from codegen.draw.units import in_file_units, is_angle, number, unit_size
from codegen.link_product import Floats
from codegen.model import Arm, Convention, JointRow, Quantity

# Column heads and the share of the width at which each begins (numbers end there instead).
_COLUMNS = (0.01, 0.05, 0.22, 0.34, 0.43, 0.55, 0.67, 0.78, 0.97)
_NUMERIC_FROM = 3
_FONT = 8.5


def draw_table(axes: Axes, arm: Arm, q: Floats) -> None:
    """One line a row; theta and d of the joint variables as the sum that the table stands for."""
    axes.axis("off")
    axes.set_xlim(0, 1)
    lines = [_head(arm), *(_cells(arm, index, row, float(q[index])) for index, row in enumerate(arm.joints))]
    axes.set_ylim(-max(len(lines) + 1.2, 6), 0.4)
    for level, cells in enumerate(lines):
        for column, text in enumerate(cells):
            align = "right" if column >= _NUMERIC_FROM else "left"
            weight = "bold" if level == 0 else "normal"
            axes.text(_COLUMNS[column], -level - 0.4, text, fontsize=_FONT, ha=align, va="center", fontweight=weight)
    axes.plot([0, 0.98], [-0.92, -0.92], color="black", linewidth=0.8)
    axes.text(0.01, -len(lines) - 0.6, _legend(arm), fontsize=7.5, va="center", color="#404040")


def _head(arm: Arm) -> list[str]:
    """With the index that each column's symbols have in the picture: a proximal row i holds a and alpha of i-1."""
    before = "i" if arm.convention is Convention.STANDARD else "i-1"
    a, alpha = f"$a_{{{before}}}$ [{arm.length_unit}]", rf"$\alpha_{{{before}}}$ [{arm.angle_unit}]"
    d, theta = f"$d_i$ [{arm.length_unit}]", rf"$\theta_i$ [{arm.angle_unit}]"
    return ["$i$", "joint", "type", a, alpha, d, theta, "drawn at", "limits"]


def _cells(arm: Arm, index: int, row: JointRow, value: float) -> list[str]:
    variable = f"$q_{{{index + 1}}}$"
    turns = is_angle(row)
    d = in_file_units(arm, row.d) if turns else _sum(variable, arm, row.d)
    theta = _sum(variable, arm, row.theta) if turns else in_file_units(arm, row.theta)
    held = " (held)" if row.name in arm.held else ""
    limits = "none" if row.limits is None else " … ".join(in_file_units(arm, end) for end in row.limits)
    drawn = number(value / unit_size(arm, turns))
    name = row.name if len(row.name) <= 24 else f"{row.name[:23]}…"
    return [f"{index + 1}", name + held, row.kind.value, in_file_units(arm, row.a), in_file_units(arm, row.alpha),
            d, theta, drawn, limits]  # fmt: skip


def _sum(variable: str, arm: Arm, offset: Quantity) -> str:
    if not offset:
        return variable
    text = in_file_units(arm, offset)
    sign = "\N{MINUS SIGN}" if text.startswith("\N{MINUS SIGN}") else "+"
    return f"{variable} {sign} {text.lstrip(chr(0x2212))}"


def _legend(arm: Arm) -> str:
    standard = arm.convention is Convention.STANDARD
    frames, order = (
        ("distal frames (standard)", "d, then a") if standard else ("proximal frames (modified)", "a, then d")
    )
    return (
        f"{frames}; cylinder: turning joint, hatched box: sliding joint; chain line: joint axis; "
        "dot or cross in a joint: its z axis points at or away from the reader;\n"
        f"arrows: x full, y dotted, z dashed; thick line: link, along {order}; broken thick line: base or tool"
    )
