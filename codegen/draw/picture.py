"""One view of an arm on a matplotlib axes: links, joints, axes, frames, labels and a scale.

What a line means is told by its style and its label, never by colour alone; the few colours differ in brightness too
(they are of Okabe and Ito's set for colour-blind readers, "Color universal design", 2008).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib import patheffects
from matplotlib.axes import Axes
from matplotlib.patches import Polygon
from matplotlib.patheffects import AbstractPathEffect

from codegen.draw.labels import Box, Placed, Placer, Wanted
from codegen.draw.scene import FrameMark, JointMark, Scene
from codegen.draw.solids import joint_outline
from codegen.draw.views import View
from codegen.link_product import Floats
from codegen.model import JointKind

LINK, JOINT_EDGE, AXIS_LINE, FRAME = "#4d4d4d", "black", "#707070", "black"
TOOL, WORLD = "#0072b2", "#8a8a8a"
_MARGIN = 0.16  # of the view, left free for labels
_FONT = 8.5
_FLAT = 0.25  # an arrow seen shorter than this share of its length points at the onlooker, and is left out


@dataclass(frozen=True, slots=True)
class Content:
    """What a view labels: lengths and joint variables, or frames."""

    lengths: bool
    frames: bool


def draw_view(axes: Axes, scene: Scene, view: View, content: Content, unit: tuple[str, float], scale: float) -> None:
    """unit: name of the length unit and its size in metres; scale: metres a pixel, `needed_scale` or more."""
    _fit(axes, view.project(_extent(scene)), scale)
    _axis_lines(axes, scene, view)
    _links(axes, scene, view)
    symbols = [_joint(axes, joint, scene, view) for joint in _far_first(scene.joints, view)]
    arrows = _frame_arrows(axes, scene, view, content.frames)
    frame = axes.get_window_extent()
    lines = _obstacle_lines(axes, scene, view) + [(arrow.start, arrow.end) for arrow in arrows]
    placer = Placer(Box(frame.x0 + 2, frame.y0 + 24, frame.x1 - 2, frame.y1 - 18), symbols, lines)
    _labels(
        axes,
        placer,
        [*_joint_labels(axes, scene, view), *(_length_labels(axes, scene, view) if content.lengths else [])],
    )
    _labels(axes, placer, _arrow_labels(arrows))
    _scale_bar(axes, unit)
    axes.set_title(view.title, loc="left", fontsize=10, fontweight="bold", pad=4)
    _directions(axes, view)


# --- the sheet ---


def _extent(scene: Scene) -> Floats:
    reach = scene.mark * 0.9
    ends = [frame.origin + reach * frame.axis(axis) for frame in scene.frames for axis in (0, 2)]
    centres = [joint.centre + side * scene.mark * 0.9 * joint.axis for joint in scene.joints for side in (-1, 1)]
    return np.vstack([scene.points[1:], ends, centres])


def needed_scale(axes: Axes, scene: Scene, view: View) -> float:
    """Metres a pixel at which the scene and its labels fit."""
    box = axes.get_window_extent()
    width, height = np.ptp(view.project(_extent(scene)), axis=0)
    free = 1 - 2 * _MARGIN
    return float(max(width / (box.width * free), height / (box.height * free)))


def _fit(axes: Axes, points: Floats, scale: float) -> None:
    """Limits around the points, at one scale in both directions."""
    box = axes.get_window_extent()
    middle = (points.min(axis=0) + points.max(axis=0)) / 2
    axes.set_xlim(middle[0] - scale * box.width / 2, middle[0] + scale * box.width / 2)
    axes.set_ylim(middle[1] - scale * box.height / 2, middle[1] + scale * box.height / 2)
    axes.set_xticks([])
    axes.set_yticks([])
    for spine in axes.spines.values():
        spine.set_color("#b0b0b0")


def _pixels(axes: Axes, points: Floats) -> Floats:
    return np.asarray(axes.transData.transform(points), dtype=np.float64)


def _scale_bar(axes: Axes, unit: tuple[str, float]) -> None:
    name, metres = unit
    (left, right), (bottom, top) = axes.get_xlim(), axes.get_ylim()
    length = round_length((right - left) * 0.28 / metres)
    x, y = left + (right - left) * 0.03, bottom + (top - bottom) * 0.045
    tick = (top - bottom) * 0.012
    end = x + length * metres
    axes.plot([x, x, x, end, end, end], [y - tick, y + tick, y, y, y - tick, y + tick], color="black", linewidth=1.2)
    axes.text(end + (right - left) * 0.015, y, f"{length:g} {name}", fontsize=8, va="center", path_effects=_halo())


def round_length(most: float) -> float:
    """The largest of 1, 2, 5, 10, 20, ... that is not above `most`."""
    power = 10.0 ** np.floor(np.log10(most))
    return float(next(step * power for step in (5.0, 2.0, 1.0) if step * power <= most * (1 + 1e-9)))


def _directions(axes: Axes, view: View) -> None:
    """Which way the world's axes run on paper, in the lower right corner."""
    box = axes.get_window_extent()
    corner = np.array([box.x1 - 46, box.y0 + 30])
    for axis, name in enumerate("xyz"):
        step = view.rows[:, axis] * 24
        if np.hypot(*step) < 6:
            continue
        start, end = axes.transAxes.inverted().transform([corner, corner + step])
        axes.annotate(
            "", xy=end, xytext=start, xycoords="axes fraction", textcoords="axes fraction",
            arrowprops={"arrowstyle": "->", "color": "#505050", "linewidth": 0.9, "shrinkA": 0, "shrinkB": 0},
        )  # fmt: skip
        x, y = axes.transAxes.inverted().transform(corner + step * (1 + 9 / np.hypot(*step)))
        axes.text(x, y, name, transform=axes.transAxes, fontsize=7.5, color="#505050", ha="center", va="center")


# --- the chain ---


def _links(axes: Axes, scene: Scene, view: View) -> None:
    for segment in scene.segments:
        if segment.length < 1e-9:
            continue
        (x0, y0), (x1, y1) = view.project(segment.start), view.project(segment.end)
        fixed = segment.symbol in ("base", "tool")
        style = {"linewidth": 2.0, "linestyle": (0, (2, 1.2))} if fixed else {"linewidth": 4.5, "linestyle": "-"}
        axes.plot([x0, x1], [y0, y1], color=LINK, solid_capstyle="round", zorder=2, **style)  # type: ignore[arg-type]


def _axis_lines(axes: Axes, scene: Scene, view: View) -> None:
    """Each joint's axis as a thin chain line, as engineering drawings show centre lines (ISO 128)."""
    for joint in scene.joints:
        reach = scene.mark * 1.25 * joint.axis
        ends = view.project(np.array([joint.centre - reach, joint.centre + reach]))
        axes.plot(ends[:, 0], ends[:, 1], color=AXIS_LINE, linewidth=0.8, linestyle=(0, (9, 2, 1.5, 2)), zorder=1)


def _far_first(joints: Sequence[JointMark], view: View) -> list[JointMark]:
    return sorted(joints, key=lambda joint: (round(float(joint.centre @ view.toward), 9), joint.number))


def _joint(axes: Axes, joint: JointMark, scene: Scene, view: View) -> Box:
    """Draws a joint; its box in pixels."""
    outline = joint_outline(joint, scene.mark, view)
    hatch = "//////" if joint.kind is JointKind.PRISMATIC else None
    silhouette = Polygon(
        outline.silhouette, facecolor="white", edgecolor=JOINT_EDGE, linewidth=1.3, zorder=3, hatch=hatch
    )
    axes.add_patch(silhouette)
    axes.add_patch(Polygon(outline.near_end, facecolor="white", edgecolor=JOINT_EDGE, linewidth=0.9, zorder=3))
    facing = float(joint.axis @ view.toward)
    if (
        abs(facing) > 0.98
    ):  # seen along its axis: a dot for a z axis that comes out of the paper, a cross for one that goes in
        x, y = view.project(joint.centre)
        marker = {"marker": "o", "markersize": 3.5} if facing > 0 else {"marker": "x", "markersize": 6.0}
        axes.plot([x], [y], color=JOINT_EDGE, zorder=4, **marker)  # type: ignore[arg-type]
    pixels = _pixels(axes, outline.silhouette)
    (left, bottom), (right, top) = pixels.min(axis=0), pixels.max(axis=0)
    return Box(float(left), float(bottom), float(right), float(top))


def _obstacle_lines(axes: Axes, scene: Scene, view: View) -> list[tuple[Floats, Floats]]:
    ends = [(segment.start, segment.end) for segment in scene.segments if segment.length > 1e-9]
    return [(_pixels(axes, view.project(start)), _pixels(axes, view.project(end))) for start, end in ends]


# --- frames ---


@dataclass(frozen=True, slots=True)
class _Arrow:
    """A frame axis on paper, in pixels; several frames' axes may be one arrow."""

    names: tuple[str, ...]
    start: Floats
    end: Floats
    colour: str


def _frame_arrows(axes: Axes, scene: Scene, view: View, every_frame: bool) -> list[_Arrow]:
    """x (full line) and z (dashed) of each frame, and y (dotted) of the tool's."""
    found: dict[tuple[float, ...], _Arrow] = {}
    for frame in scene.frames:
        if not every_frame and frame.index != "tool":
            continue
        tool = frame.index == "tool"
        for number, letter in ((0, "x"), (1, "y"), (2, "z")):
            if letter == "y" and not tool:
                continue
            step = view.project(frame.axis(number)) * scene.mark * (1.25 if tool else 1.0)
            if np.hypot(*step) < _FLAT * scene.mark:
                continue
            start = view.project(frame.origin)
            key = tuple(np.round(np.concatenate([start, step]) / scene.mark, 3) + 0.0)
            name = _axis_name(letter, frame)
            if key in found:
                found[key] = _Arrow((*found[key].names, name), found[key].start, found[key].end, found[key].colour)
                continue
            colour = {"tool": TOOL, "world": WORLD}.get(frame.index, FRAME)
            found[key] = _Arrow((name,), _pixels(axes, start), _pixels(axes, start + step), colour)
            _arrow(axes, start, start + step, letter, colour)
    return list(found.values())


def _axis_name(letter: str, frame: FrameMark) -> str:
    index = {"tool": r"\mathrm{t}", "world": r"\mathrm{w}"}.get(frame.index, frame.index)
    return f"${letter}_{{{index}}}$"


def _arrow(axes: Axes, start: Floats, end: Floats, letter: str, colour: str) -> None:
    style = {"x": "-", "y": (0, (1, 1.5)), "z": (0, (4, 1.6))}[letter]
    axes.annotate(
        "", xy=(end[0], end[1]), xytext=(start[0], start[1]), zorder=5,
        arrowprops={"arrowstyle": "-|>,head_width=0.16,head_length=0.38", "color": colour, "linewidth": 1.3,
                    "linestyle": style, "shrinkA": 0, "shrinkB": 0},
    )  # fmt: skip


# --- labels ---


def _text_size(axes: Axes, text: str) -> tuple[float, float]:
    """Width and height in pixels."""
    drawn = axes.text(0, 0, text, fontsize=_FONT)
    box = drawn.get_window_extent()
    drawn.remove()
    return float(box.width), float(box.height)


def _wanted(axes: Axes, text: str, at: Floats, toward: Floats | None = None) -> Wanted:
    x, y = _pixels(axes, at)
    width, height = _text_size(axes, text)
    size = float(np.hypot(*toward)) if toward is not None else 0.0
    direction = (float(toward[0]) / size, float(toward[1]) / size) if toward is not None and size else None
    return Wanted(text, (float(x), float(y)), width, height, direction)


def _joint_labels(axes: Axes, scene: Scene, view: View) -> list[Wanted]:
    """The joint's variable: theta of a turning joint, d of a sliding one."""
    labels = []
    for joint in scene.joints:
        symbol = r"\theta" if joint.kind is JointKind.REVOLUTE else "d"
        outline = _pixels(axes, joint_outline(joint, scene.mark, view).silhouette)
        text = f"${symbol}_{{{joint.number}}}$"
        width, height = _text_size(axes, text)
        x, y = (outline.min(axis=0) + outline.max(axis=0)) / 2
        half_width, half_height = np.ptp(outline, axis=0) / 2
        clear = (float(half_width), float(half_height))
        labels.append(Wanted(text, (float(x), float(y)), width, height, clear=clear))
    return labels


def _length_labels(axes: Axes, scene: Scene, view: View) -> list[Wanted]:
    """The symbols of lengths that can be seen, but for the d of a sliding joint, which is at the joint already."""
    slides = {f"d_{joint.number}" for joint in scene.joints if joint.kind is JointKind.PRISMATIC}
    labels = []
    for segment in scene.segments:
        seen = view.project(segment.end - segment.start)
        if segment.symbol in ("base", "tool") or segment.symbol in slides or np.hypot(*seen) < 0.02 * scene.size:
            continue
        letter, index = segment.symbol.split("_")
        middle = view.project((segment.start + segment.end) / 2)
        labels.append(_wanted(axes, f"${letter}_{{{index}}}$", middle, np.array([-seen[1], seen[0]])))
    return labels


def _arrow_labels(arrows: Sequence[_Arrow]) -> list[tuple[_Arrow, str]]:
    return [(arrow, ", ".join(arrow.names)) for arrow in arrows]


def _labels(axes: Axes, placer: Placer, wanted: Sequence[Wanted | tuple[_Arrow, str]]) -> None:
    for item in wanted:
        if isinstance(item, Wanted):
            _write(axes, placer.place(item), "black")
            continue
        arrow, text = item
        width, height = _text_size(axes, text)
        direction = (arrow.end - arrow.start) / (float(np.hypot(*(arrow.end - arrow.start))) or 1.0)
        anchor = (float(arrow.end[0]), float(arrow.end[1]))
        label = Wanted(text, anchor, width, height, (float(direction[0]), float(direction[1])))
        _write(axes, placer.place(label), arrow.colour)


def _halo() -> list[AbstractPathEffect]:
    """White around letters, where they stand on lines."""
    return [patheffects.withStroke(linewidth=2.5, foreground="white")]


def _write(axes: Axes, placed: Placed, colour: str) -> None:
    to_data = axes.transData.inverted()
    x, y = to_data.transform(placed.centre)
    text = placed.wanted.text
    axes.text(x, y, text, fontsize=_FONT, color=colour, ha="center", va="center", zorder=7, path_effects=_halo())
    if placed.needs_line:
        ends = to_data.transform([placed.wanted.anchor, placed.centre])
        axes.plot(ends[:, 0], ends[:, 1], color="#909090", linewidth=0.5, zorder=1.5)
