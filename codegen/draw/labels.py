"""Places labels so that they cover neither one another nor, where it can be helped, the drawing. All in pixels."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from codegen.link_product import Floats

_DIRECTIONS = 16
_DISTANCES = (4.0, 9.0, 16.0, 26.0, 38.0, 54.0)
_ON_LABEL, _OUTSIDE, _ON_SYMBOL, _ON_LINE = 1000.0, 1000.0, 60.0, 12.0


@dataclass(frozen=True, slots=True)
class Box:
    """left, bottom, right, top."""

    left: float
    bottom: float
    right: float
    top: float

    def overlaps(self, other: Box) -> bool:
        apart = (
            self.right <= other.left or other.right <= self.left or self.top <= other.bottom or other.top <= self.bottom
        )
        return not apart

    def inside(self, other: Box) -> bool:
        level = other.left <= self.left and self.right <= other.right
        return level and other.bottom <= self.bottom and self.top <= other.top

    def crossed_by(self, start: Floats, end: Floats) -> bool:
        """Whether the straight line from start to end enters the box (Liang and Barsky's clipping)."""
        low, high = 0.0, 1.0
        for axis, (least, most) in enumerate(((self.left, self.right), (self.bottom, self.top))):
            step = float(end[axis] - start[axis])
            if abs(step) < 1e-9:
                if not least <= start[axis] <= most:
                    return False
                continue
            ends = sorted(((least - start[axis]) / step, (most - start[axis]) / step))
            low, high = max(low, float(ends[0])), min(high, float(ends[1]))
        return low <= high


@dataclass(frozen=True, slots=True)
class Wanted:
    """A label to place: what it is about, how large it is, and the direction it would best stand in (or None).

    clear: half the width and height of the symbol around the anchor, which the label keeps out of.
    """

    text: str
    anchor: tuple[float, float]
    width: float
    height: float
    toward: tuple[float, float] | None = None
    clear: tuple[float, float] = (0.0, 0.0)


@dataclass(frozen=True, slots=True)
class Placed:
    """The centre of a label, and whether it stands so far off that a line must lead to its anchor."""

    wanted: Wanted
    centre: tuple[float, float]
    needs_line: bool


class Placer:
    """Places labels one after the other into a frame with obstacles."""

    def __init__(self, frame: Box, symbols: Sequence[Box], lines: Sequence[tuple[Floats, Floats]]) -> None:
        self.frame = frame
        self.symbols = list(symbols)
        self.lines = list(lines)
        self.taken: list[Box] = []

    def place(self, wanted: Wanted) -> Placed:
        """At the cheapest of the places around the anchor; the first of equal ones."""
        candidates = [(self._cost(wanted, *place), place) for place in _places(wanted)]
        _, (centre, distance) = min(candidates, key=lambda candidate: candidate[0])
        self.taken.append(_box(wanted, centre, 2.0))
        return Placed(wanted, centre, distance > _DISTANCES[2])

    def _cost(self, wanted: Wanted, centre: tuple[float, float], distance: float) -> float:
        box = _box(wanted, centre, 1.0)
        cost = distance * 0.5 + (0 if box.inside(self.frame) else _OUTSIDE)
        cost += _ON_LABEL * sum(box.overlaps(other) for other in self.taken)
        cost += _ON_SYMBOL * sum(box.overlaps(other) for other in self.symbols)
        cost += _ON_LINE * sum(box.crossed_by(start, end) for start, end in self.lines)
        if wanted.toward is not None:
            offset = np.array(centre) - wanted.anchor
            cost += 8 * (1 - float(offset @ wanted.toward) / (float(np.linalg.norm(offset)) or 1.0))
        return cost


def _places(wanted: Wanted) -> list[tuple[tuple[float, float], float]]:
    """Centres around the anchor, the label's edge at each distance in each direction."""
    places = []
    for distance in _DISTANCES:
        for number in range(_DIRECTIONS):
            angle = 2 * np.pi * number / _DIRECTIONS
            x = wanted.anchor[0] + np.cos(angle) * (distance + wanted.clear[0] + wanted.width / 2)
            y = wanted.anchor[1] + np.sin(angle) * (distance + wanted.clear[1] + wanted.height / 2)
            places.append(((float(x), float(y)), distance))
    return places


def _box(wanted: Wanted, centre: tuple[float, float], margin: float) -> Box:
    half_width, half_height = wanted.width / 2 + margin, wanted.height / 2 + margin
    return Box(centre[0] - half_width, centre[1] - half_height, centre[0] + half_width, centre[1] + half_height)
