"""Vectors, rotations and rigid motions whose entries are nodes of one program."""

from __future__ import annotations

from dataclasses import dataclass, field

from codegen.program import Builder, Node

Vector = tuple[Node, Node, Node]
Matrix = tuple[Vector, Vector, Vector]  # rows
AXES = "xyz"


@dataclass(frozen=True, slots=True)
class Pair:
    """The cosine and the sine of one angle, known or to be found."""

    cosine: Node
    sine: Node


@dataclass(frozen=True, slots=True)
class Rigid:
    """x -> rotation x + shift.

    undone   the motion that this one was made to undo: undoing it again gives that motion back, not a longer formula
    factors  the motions that it was composed of: each is undone by itself, for the same reason
    """

    rotation: Matrix
    shift: Vector
    undone: Rigid | None = field(default=None, compare=False)
    factors: tuple[Rigid, ...] = field(default=(), compare=False)


class Space:
    """Vector algebra over one builder."""

    def __init__(self, builder: Builder) -> None:
        self.b = builder
        zero, one = builder.integer(0), builder.integer(1)
        self.zero, self.one = zero, one
        self.origin: Vector = (zero, zero, zero)
        self.unit: Matrix = ((one, zero, zero), (zero, one, zero), (zero, zero, one))
        self.identity = Rigid(self.unit, self.origin)

    def named(self, vector: Vector, name: str, note: str = "") -> Vector:
        for axis, entry in zip(AXES, vector, strict=True):
            self.b.named(entry, f"{name}_{axis}", note)
            note = ""
        return vector

    def dot(self, u: Vector, v: Vector) -> Node:
        return self.b.add(*(self.b.mul(a, c) for a, c in zip(u, v, strict=True)))

    def plus(self, u: Vector, v: Vector) -> Vector:
        return (self.b.add(u[0], v[0]), self.b.add(u[1], v[1]), self.b.add(u[2], v[2]))

    def minus(self, u: Vector, v: Vector) -> Vector:
        return (self.b.sub(u[0], v[0]), self.b.sub(u[1], v[1]), self.b.sub(u[2], v[2]))

    def scaled(self, u: Vector, k: Node) -> Vector:
        return (self.b.mul(k, u[0]), self.b.mul(k, u[1]), self.b.mul(k, u[2]))

    def cross(self, u: Vector, v: Vector) -> Vector:
        b = self.b
        return (
            b.sub(b.mul(u[1], v[2]), b.mul(u[2], v[1])),
            b.sub(b.mul(u[2], v[0]), b.mul(u[0], v[2])),
            b.sub(b.mul(u[0], v[1]), b.mul(u[1], v[0])),
        )

    def along_z(self, k: Node) -> Vector:
        return (self.zero, self.zero, k)

    def times(self, m: Matrix, v: Vector) -> Vector:
        return (self.dot(m[0], v), self.dot(m[1], v), self.dot(m[2], v))

    def transposed(self, m: Matrix) -> Matrix:
        return ((m[0][0], m[1][0], m[2][0]), (m[0][1], m[1][1], m[2][1]), (m[0][2], m[1][2], m[2][2]))

    def column(self, m: Matrix, k: int) -> Vector:
        return (m[0][k], m[1][k], m[2][k])

    def product(self, m: Matrix, n: Matrix) -> Matrix:
        turned = self.transposed(n)
        rows = [(self.dot(row, turned[0]), self.dot(row, turned[1]), self.dot(row, turned[2])) for row in m]
        return (rows[0], rows[1], rows[2])

    def about_z(self, pair: Pair) -> Matrix:
        c, s = pair.cosine, pair.sine
        return ((c, self.b.neg(s), self.zero), (s, c, self.zero), (self.zero, self.zero, self.one))

    def spun(self, pair: Pair, v: Vector) -> Vector:
        """The vector turned about z."""
        b, c, s = self.b, pair.cosine, pair.sine
        return (b.sub(b.mul(c, v[0]), b.mul(s, v[1])), b.add(b.mul(s, v[0]), b.mul(c, v[1])), v[2])

    def opposite(self, pair: Pair) -> Pair:
        return Pair(pair.cosine, self.b.neg(pair.sine))

    def sum_of(self, first: Pair, second: Pair) -> Pair:
        """The pair of the sum of two angles."""
        b = self.b
        return Pair(
            b.sub(b.mul(first.cosine, second.cosine), b.mul(first.sine, second.sine)),
            b.add(b.mul(first.sine, second.cosine), b.mul(first.cosine, second.sine)),
        )

    # -- rigid motions -----------------------------------------------------------------------------------------------
    def moved(self, g: Rigid, v: Vector) -> Vector:
        return self.plus(self.times(g.rotation, v), g.shift)

    def compose(self, *motions: Rigid) -> Rigid:
        total = self.identity
        for g in motions:
            if total == self.identity or g == self.identity:
                total = g if total == self.identity else total
                continue
            factors = (*(total.factors or (total,)), *(g.factors or (g,)))
            shift = self.moved(total, g.shift)
            total = Rigid(self.product(total.rotation, g.rotation), shift, factors=factors)
        return total

    def inverse(self, g: Rigid) -> Rigid:
        if g.undone is not None:
            return g.undone
        if g.factors:
            backward = self.compose(*(self.inverse(factor) for factor in reversed(g.factors)))
            return Rigid(backward.rotation, backward.shift, undone=g)
        back = self.transposed(g.rotation)
        return Rigid(back, self.negative(self.times(back, g.shift)), undone=g)

    def negative(self, v: Vector) -> Vector:
        return (self.b.neg(v[0]), self.b.neg(v[1]), self.b.neg(v[2]))

    def slide_z(self, k: Node) -> Rigid:
        return self.identity if k.is_exactly(0) else Rigid(self.unit, self.along_z(k))
