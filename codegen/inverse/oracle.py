"""Decides whether a value vanishes whatever the pose: by evaluating it with 60 digits at points drawn at random.

A polynomial or rational identity that holds at several random points holds everywhere, but for a chance below 1e-40
(Schwartz 1980; Zippel 1979). The points are drawn from a fixed integer generator, so every machine decides alike.
"""

from __future__ import annotations

from codegen.evaluate import node_value
from codegen.exact import MP, Real
from codegen.geometry import Pair, Space, Vector
from codegen.program import Node, reachable

_SAMPLES = 3
_NOTHING = MP.mpf(10) ** -35


class Oracle:
    """Holds random values for every leaf that a derivation declares."""

    def __init__(self) -> None:
        self._state = 20011
        self._values: list[dict[Node, Real]] = [{} for _ in range(_SAMPLES)]

    def _random(self) -> Real:
        """A number in (0.1, 1.1), the same on every machine."""
        self._state = (6364136223846793005 * self._state + 1442695040888963407) % 2**64
        return MP.mpf(self._state >> 11) / 2**53 + MP.mpf(1) / 10

    def declare_real(self, node: Node) -> None:
        for values in self._values:
            values[node] = self._random() * 2 - 1

    def declare_pair(self, pair: Pair) -> None:
        for values in self._values:
            angle = self._random() * 5
            values[pair.cosine], values[pair.sine] = MP.cos(angle), MP.sin(angle)

    def declare_rotation(self, space: Space, rows: tuple[Vector, Vector, Vector]) -> None:
        """A random rotation: Rz Ry Rz of random angles."""
        for values in self._values:
            a, b, c = (self._random() * 3 for _ in range(3))
            for row, numbers in zip(rows, _rotation(a, b, c), strict=True):
                values.update(zip(row, numbers, strict=True))

    def vanishes(self, *nodes: Node) -> bool:
        return all(self._vanishes(node) for node in nodes)

    def _vanishes(self, node: Node) -> bool:
        if node.is_constant:
            return bool(abs(node.value) < _NOTHING)
        return all(abs(self._value(node, values)) < _NOTHING for values in self._values)

    def is_constant(self, node: Node) -> bool:
        """Whether it has one value whatever the pose."""
        if node.is_constant:
            return True
        first, *others = (self._value(node, values) for values in self._values)
        return all(abs(value - first) < _NOTHING for value in others)

    def sample(self, node: Node) -> Real:
        """The value at the first random point."""
        return node.value if node.is_constant else self._value(node, self._values[0])

    def _value(self, node: Node, values: dict[Node, Real]) -> Real:
        for needed in reachable([node]):
            if needed not in values:
                values[needed] = node_value(needed, values, MP.mpf, MP.sqrt)
        return values[node]


def _rotation(a: Real, b: Real, c: Real) -> list[list[Real]]:
    ca, sa, cb, sb, cc, sc = MP.cos(a), MP.sin(a), MP.cos(b), MP.sin(b), MP.cos(c), MP.sin(c)
    return [
        [ca * cb * cc - sa * sc, -ca * cb * sc - sa * cc, ca * sb],
        [sa * cb * cc + ca * sc, -sa * cb * sc + ca * cc, sa * sb],
        [-sb * cc, sb * sc, cb],
    ]
