"""An error map as an SVG picture: classes a fixed factor apart, light for small errors and dark for large ones.

The colours are seven of the map "cividis" (Nunez, Anderton and Renslow, Optimizing colormaps with consideration for color
vision deficiency, PLOS ONE 13(7), 2018): even in lightness, so they read the same in print and to colour-blind eyes.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from html import escape

from codegen.page.content import ErrorMap

COLOURS = ("#fee838", "#d9c55c", "#b4a76f", "#8f8a79", "#6c6e72", "#3f5470", "#00224e")  # small errors first
_WIDTH, _LEFT, _BOTTOM, _TOP, _RIGHT = 460.0, 58.0, 42.0, 8.0, 10.0
_MOST_HEIGHT, _LEAST_WIDTH = 440.0, 250.0  # the least leaves room for the words below


@dataclass(frozen=True, slots=True)
class Class:
    """A colour, and the errors that it stands for in words."""

    colour: str
    text: str
    share: str


def shown_classes(found: ErrorMap) -> list[Class]:
    """The legend, largest errors first; `share` of the cells."""
    bounds = _bounds(found)
    cells = [class_of(value, bounds) for row in found.values for value in row if value is not None]
    rows = []
    for number, colour in enumerate(COLOURS):
        low = f"{bounds[number - 1]:.2g} to " if number else "up to "
        share = 100 * cells.count(number) / len(cells)
        rows.append(Class(colour, f"{low}{bounds[number]:.2g} {found.unit}", f"{share:.0f} %"))
    return rows[::-1]


def _bounds(found: ErrorMap) -> tuple[float, ...]:
    """Upper bounds of the classes: the last is the largest error, rounded up to two digits; the first leaves one cell in
    twenty below it, unless that would put them more than a factor of ten apart.
    """
    values = sorted(value for row in found.values for value in row if value is not None)
    largest = values[-1] if values and values[-1] > 0.0 else 1e-300
    unit = 10.0 ** (math.floor(math.log10(largest)) - 1)
    top = math.ceil(largest / unit * (1 - 1e-12)) * unit
    steps = len(COLOURS) - 1
    low = max(values[len(values) // 20] if values else 0.0, top * 10.0**-steps)
    ratio = max((top / low) ** (1 / steps), 1.1)
    return tuple(top / ratio**k for k in reversed(range(len(COLOURS))))


def class_of(value: float, bounds: tuple[float, ...]) -> int:
    return next((number for number, bound in enumerate(bounds) if value <= bound), len(bounds) - 1)


def svg(found: ErrorMap) -> str:
    """The picture; its words are in the page's own font, its lines in the page's own colour."""
    width, height = _extent(found.right), _extent(found.up)
    scale = min((_WIDTH - _LEFT - _RIGHT) / width, (_MOST_HEIGHT - _TOP - _BOTTOM) / height)
    place = _Place(found.right[0], found.up[0], scale, _TOP + height * scale)
    right, bottom = _LEFT + width * scale, place.bottom
    parts = [
        *_cells(found, place),
        f'<path class="frame" d="M{_LEFT:g} {_TOP:g}H{right:.2f}V{bottom:.2f}H{_LEFT:g}Z"/>',
        *_ticks(found, place, right),
        f'<text class="name" x="{(_LEFT + right) / 2:.1f}" y="{bottom + 36:.1f}">{_label(found.right_label, found)}</text>',
        f'<text class="name" transform="translate(13 {(_TOP + bottom) / 2:.1f}) rotate(-90)">'
        f"{_label(found.up_label, found)}</text>",
    ]
    title = escape(f"{found.title}: {found.note}", quote=True)
    wide, high = max(right + _RIGHT, _LEAST_WIDTH), bottom + _BOTTOM
    size = f'viewBox="0 0 {wide:.1f} {high:.1f}" width="{wide:.0f}" height="{high:.0f}"'
    return f'<svg class="map" role="img" {size} aria-label="{title}">{"".join(parts)}</svg>'


def _label(text: str, found: ErrorMap) -> str:
    return escape(f"{text}, {found.length_unit}")


def _extent(edges: tuple[float, ...]) -> float:
    return edges[-1] - edges[0]


@dataclass(frozen=True, slots=True)
class _Place:
    """From lengths to paper."""

    left: float
    low: float
    scale: float
    bottom: float

    def x(self, value: float) -> float:
        return _LEFT + (value - self.left) * self.scale

    def y(self, value: float) -> float:
        return self.bottom - (value - self.low) * self.scale


def _cells(found: ErrorMap, place: _Place) -> list[str]:
    """One path a colour, its cells joined along the rows."""
    bounds = _bounds(found)
    paths: dict[int, list[str]] = {}
    for k, row in enumerate(found.values):
        classes = [None if value is None else class_of(value, bounds) for value in row]
        start = 0
        while start < len(classes):
            end, number = start + 1, classes[start]
            while end < len(classes) and classes[end] == number:
                end += 1
            if number is not None:
                x, right = place.x(found.right[start]), place.x(found.right[end])
                y, low = place.y(found.up[k + 1]), place.y(found.up[k])
                paths.setdefault(number, []).append(f"M{x:.1f} {y:.1f}H{right:.1f}V{low:.1f}H{x:.1f}Z")
            start = end
    return [f'<path fill="{COLOURS[number]}" d="{"".join(paths[number])}"/>' for number in sorted(paths)]


def _ticks(found: ErrorMap, place: _Place, right: float) -> list[str]:
    parts = []
    for value in _round_numbers(found.right[0], found.right[-1]):
        x = place.x(value)
        parts.append(f'<path class="tick" d="M{x:.1f} {place.bottom:.1f}v4"/>')
        parts.append(f'<text class="across" x="{x:.1f}" y="{place.bottom + 16:.1f}">{_number(value)}</text>')
    for value in _round_numbers(found.up[0], found.up[-1]):
        y = place.y(value)
        parts.append(f'<path class="tick" d="M{_LEFT:g} {y:.1f}h-4"/>')
        parts.append(f'<text class="beside" x="{_LEFT - 7:g}" y="{y + 4:.1f}">{_number(value)}</text>')
    return parts


def _number(value: float) -> str:
    return f"{value:.6g}".replace("-", "\N{MINUS SIGN}")


def _round_numbers(low: float, high: float) -> list[float]:
    """Three to six values between the ends, 1, 2 or 5 times a power of ten apart."""
    rough = (high - low) / 5
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(factor * power for factor in (1, 2, 5, 10) if factor * power >= rough * (1 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    return [round(number * step, 12) + 0.0 for number in range(first, math.floor(high / step + 1e-9) + 1)]
