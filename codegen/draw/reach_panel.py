"""The reachable region on a matplotlib axes, with the places where the arm's task is singular."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from matplotlib.axes import Axes
from numpy.typing import NDArray

from codegen.draw.picture import AXIS_LINE, LINK, TOOL
from codegen.draw.scene import scene_of
from codegen.draw.section import SAMPLES, Region, Section, r_sequence, ranges, reached_region, section_of
from codegen.draw.singular import SingularSet, singular_sets
from codegen.link_product import Floats, tool_points
from codegen.model import Arm

Positions = Callable[[Floats], Floats]

_REGION, _REGION_EDGE = "#dcdcdc", "black"
_EVERYWHERE = 0.8  # of the region's blocks: a set that covers more is a matter of posture, not of place
_BLOCK = 12  # cells along the side of a block
_APART = 3  # cells: marks of one set are not drawn closer
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
    sets = singular_sets(arm, lower, upper)
    everywhere = _mark_singular(axes, section, region, sets, forward, scale)
    _chain(axes, arm, q, section, scale)
    _finish(axes, section, region, unit)
    _explain(axes, _remarks(sets, everywhere))
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
        if _is_everywhere(region, coordinates) or marked == len(_MARKERS):
            everywhere.append(group)
            continue
        first = np.unique(_blocks(region, coordinates, _APART), axis=0, return_index=True)[1]
        marker, colour = _MARKERS[marked]
        marked += 1
        place = coordinates[first] * scale
        axes.scatter(
            place[:, 0], place[:, 1], s=13, marker=marker, c=colour, linewidths=0.8, zorder=3,
            label=f"singular: joints {_listed(group.joints)}",
        )  # fmt: skip
    return everywhere


def _blocks(region: Region, coordinates: Floats, side: int) -> NDArray[np.int64]:
    """Row and column of the block of cells that each point is in: (N, 2)."""
    return np.asarray(np.stack(region.cells(coordinates), axis=1) // side)


def _is_everywhere(region: Region, coordinates: Floats) -> bool:
    filled = np.unique(np.argwhere(region.filled) // _BLOCK, axis=0)
    return len(np.unique(_blocks(region, coordinates, _BLOCK), axis=0)) > _EVERYWHERE * len(filled)


def _explain(axes: Axes, remarks: str) -> None:
    """Legend and remarks under the axes."""
    figure = axes.figure
    handles, names = axes.get_legend_handles_labels()
    figure.legend(handles, names, fontsize=7.5, loc="upper left", bbox_to_anchor=(0.745, 0.215), frameon=False)
    figure.text(0.75, 0.025, remarks, fontsize=7.5, va="bottom", color="#404040")


def _listed(joints: Sequence[int]) -> str:
    return ", ".join(map(str, joints))


def _remarks(sets: Sequence[SingularSet], everywhere: Sequence[SingularSet]) -> str:
    if not sets:
        return "Sampled within limits. No singular place was found."
    lines = ["Sampled within limits. Singular: the joints named can move", "while what the task reads stays at rest."]
    if everywhere:
        named = "; ".join(_listed(group.joints) for group in everywhere)
        lines.append(f"Singular at no one place but by posture: joints {named}.")
    return "\n".join(lines)


def _chain(axes: Axes, arm: Arm, q: Floats, section: Section, scale: float) -> None:
    """The chain as drawn in the views, seen from the side, and its tool point."""
    points = section.side_on(scene_of(arm, q).points) * scale
    axes.plot(points[2:, 0], points[2:, 1], color=LINK, linewidth=1.8, zorder=4, label="the arm as drawn")
    axes.plot(
        points[-1:, 0],
        points[-1:, 1],
        color=TOOL,
        marker="D",
        markersize=5,
        linestyle="none",
        zorder=5,
        label="its tool point",
    )
    if section.polar:
        axes.axvline(0, color=AXIS_LINE, linewidth=0.8, linestyle=(0, (9, 2, 1.5, 2)), zorder=1.5)


def _finish(axes: Axes, section: Section, region: Region, unit: tuple[str, float]) -> None:
    axes.set_aspect("equal", adjustable="box", anchor="N")
    axes.set_xlabel(f"{section.labels[0]} [{unit[0]}]", fontsize=8.5)
    axes.set_ylabel(f"{section.labels[1]} [{unit[0]}]", fontsize=8.5)
    axes.tick_params(labelsize=7.5)
    axes.grid(color="#c8c8c8", linewidth=0.4, zorder=0)
    axes.set_axisbelow(True)
    axes.set_title(f"Reach: {section.about}", loc="left", fontsize=10, fontweight="bold", pad=4)
