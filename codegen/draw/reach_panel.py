"""The reachable region on a matplotlib axes, with the places where the arm's task is singular."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from matplotlib.axes import Axes

from codegen.draw.picture import AXIS_LINE, LINK, TOOL
from codegen.draw.scene import scene_of
from codegen.draw.section import SAMPLES, Region, Section, r_sequence, ranges, reached_region, section_of
from codegen.draw.singular import SingularSet, singular_sets
from codegen.link_product import Floats, tool_points
from codegen.model import Arm

Positions = Callable[[Floats], Floats]

_REGION, _REGION_EDGE = "#dcdcdc", "black"
_EVERYWHERE = 0.6  # of the region's cells: a set that covers more is a matter of posture, not of place
_MARKERS = (("x", "black"), (".", "#0072b2"), ("+", "#d55e00"), ("1", "black"))


def draw_reach(
    axes: Axes, arm: Arm, q: Floats, unit: tuple[str, float], positions: Positions | None
) -> tuple[str, ...]:
    """Fills the axes; returns notes. q: where the chain is drawn."""
    forward = positions or (lambda vectors: tool_points(arm, vectors))
    lower, upper, notes = ranges(arm)
    vectors = lower + r_sequence(SAMPLES, len(lower)) * (upper - lower)
    points = forward(vectors)
    section = section_of(arm, points)
    region = reached_region(section, forward, lower, upper, vectors, points)
    scale = 1 / unit[1]
    _fill(axes, region, scale)
    everywhere = _mark_singular(axes, section, region, singular_sets(arm, lower, upper), forward, scale)
    _chain(axes, arm, q, section, scale)
    _finish(axes, section, region, unit)
    axes.text(0, -0.075, _remarks(everywhere), transform=axes.transAxes, fontsize=7.5, va="top", color="#404040")
    return notes


def _fill(axes: Axes, region: Region, scale: float) -> None:
    """The filled cells, smoothed by half a cell, and their outline."""
    padded = np.pad(region.filled, 1).astype(float)
    right, up = (_middles(edges) * scale for edges in (region.right, region.up))
    axes.contourf(right, up, padded, levels=[0.5, 1.5], colors=[_REGION], zorder=1)
    axes.contour(right, up, padded, levels=[0.5], colors=[_REGION_EDGE], linewidths=1.0, zorder=2)


def _middles(edges: Floats) -> Floats:
    """Middles of the cells, with one more at each end."""
    cell = edges[1] - edges[0]
    return np.concatenate([[edges[0] - cell / 2], edges[:-1] + cell / 2, [edges[-1] + cell / 2]])


def _mark_singular(
    axes: Axes, section: Section, region: Region, sets: Sequence[SingularSet], forward: Positions, scale: float
) -> list[SingularSet]:
    """One mark for each cell that a set passes through; returns the sets that are everywhere."""
    everywhere: list[SingularSet] = []
    marked = 0
    for group in sets:
        coordinates = section.coordinates(forward(group.q))
        rows, columns = region.cells(coordinates)
        cells, first = np.unique(np.stack([rows // 2, columns // 2], axis=1), axis=0, return_index=True)
        if 4 * len(cells) > _EVERYWHERE * region.filled.sum() or marked == len(_MARKERS):
            everywhere.append(group)
            continue
        marker, colour = _MARKERS[marked]
        marked += 1
        place = coordinates[first] * scale
        axes.scatter(
            place[:, 0], place[:, 1], s=13, marker=marker, c=colour, linewidths=0.8, zorder=3,
            label=f"singular: joints {_listed(group.joints)}",
        )  # fmt: skip
    return everywhere


def _listed(joints: Sequence[int]) -> str:
    return ", ".join(map(str, joints))


def _remarks(everywhere: Sequence[SingularSet]) -> str:
    lines = ["Sampled within limits. Singular: the joints named can move while the tool rests."]
    if everywhere:
        named = "; ".join(_listed(group.joints) for group in everywhere)
        lines.append(f"Singular at no one place but by posture: joints {named}.")
    return "\n".join(lines)


def _chain(axes: Axes, arm: Arm, q: Floats, section: Section, scale: float) -> None:
    """The chain as drawn in the views, seen from the side, and its tool point."""
    points = section.side_on(scene_of(arm, q).points) * scale
    axes.plot(points[2:, 0], points[2:, 1], color=LINK, linewidth=1.8, zorder=4, label="the arm as drawn")
    axes.plot(points[-1:, 0], points[-1:, 1], color=TOOL, marker="D", markersize=5, linestyle="none", zorder=5)
    if section.polar:
        axes.axvline(0, color=AXIS_LINE, linewidth=0.8, linestyle=(0, (9, 2, 1.5, 2)), zorder=1.5)


def _finish(axes: Axes, section: Section, region: Region, unit: tuple[str, float]) -> None:
    axes.set_aspect("equal", adjustable="datalim")
    axes.set_xlabel(f"{section.labels[0]} [{unit[0]}]", fontsize=8.5)
    axes.set_ylabel(f"{section.labels[1]} [{unit[0]}]", fontsize=8.5)
    axes.tick_params(labelsize=7.5)
    axes.grid(color="#c8c8c8", linewidth=0.4, zorder=0)
    axes.set_axisbelow(True)
    axes.set_title(f"Reach: {section.about}", loc="left", fontsize=10, fontweight="bold", pad=4)
    axes.legend(fontsize=7.5, loc="upper right", framealpha=0.9)
