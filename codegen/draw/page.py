"""The sheet: arranges views, table and region, and turns them into the bytes of a file."""

from __future__ import annotations

import io
from collections.abc import Callable
from typing import Any

import matplotlib
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from codegen.draw.picture import Content, draw_view, needed_scale
from codegen.draw.scene import scene_of
from codegen.draw.table_panel import draw_table
from codegen.draw.units import LENGTH_SIZE
from codegen.draw.views import oblique_view, side_view, top_view
from codegen.link_product import Floats
from codegen.model import Arm

_SETTINGS: dict[Any, Any] = {
    "svg.hashsalt": "linkwright",
    "svg.fonttype": "path",
    "pdf.fonttype": 42,
    "font.family": "DejaVu Sans",  # comes with matplotlib: the same letters on every machine
    "mathtext.fontset": "dejavusans",
    "hatch.linewidth": 0.7,
}
_NO_DATE: dict[str, dict[str, None]] = {
    "svg": {"Date": None},
    "pdf": {"CreationDate": None},
    "png": {"Software": None},
}
_PNG_DOTS = 150  # per inch


def page_bytes(
    arm: Arm, q: Floats, picture_format: str, reach: bool, positions: Callable[[Floats], Floats] | None
) -> tuple[bytes, tuple[str, ...]]:
    """The file's content, and notes."""
    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_SETTINGS)
        figure = Figure(figsize=(17.0 if reach else 12.0, 8.6))
        FigureCanvasAgg(figure)
        notes = compose(figure, arm, q, reach, positions)
        content = io.BytesIO()
        dots = _PNG_DOTS if picture_format == "png" else 100
        figure.savefig(content, format=picture_format, dpi=dots, metadata=_NO_DATE[picture_format])
    return content.getvalue(), notes


def compose(
    figure: Figure, arm: Arm, q: Floats, reach: bool, positions: Callable[[Floats], Floats] | None
) -> tuple[str, ...]:
    scene = scene_of(arm, q)
    unit = (arm.length_unit, LENGTH_SIZE[arm.length_unit])
    share = 12.0 / 17.0 if reach else 1.0  # of the width for views and table

    def area(left: float, bottom: float, width: float, height: float) -> tuple[float, float, float, float]:
        return left * share, bottom, width * share, height

    figure.text(0.012, 0.968, arm.name, fontsize=14, fontweight="bold", va="center")
    figure.text(0.988, 0.968, f"task {arm.task.key}: {arm.task.matches}", fontsize=9, ha="right", va="center")
    views = (
        (oblique_view(), area(0.012, 0.28, 0.40, 0.63), Content(lengths=False, frames=True)),
        (side_view(scene), area(0.424, 0.28, 0.277, 0.63), Content(lengths=True, frames=False)),
        (top_view(), area(0.711, 0.28, 0.277, 0.63), Content(lengths=True, frames=False)),
    )
    panels = [(figure.add_axes(place), view, content) for view, place, content in views]
    scales = [needed_scale(axes, scene, view) for axes, view, _ in panels]
    for (axes, view, content), scale in zip(panels, (scales[0], *[max(scales[1:])] * 2), strict=True):
        draw_view(axes, scene, view, content, unit, scale)
    draw_table(figure.add_axes(area(0.012, 0.01, 0.976, 0.24)), arm, q)
    if not reach:
        return ()
    from codegen.draw.reach_panel import draw_reach

    return draw_reach(figure.add_axes((0.752, 0.28, 0.236, 0.63)), arm, q, unit, positions)
