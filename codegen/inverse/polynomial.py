"""Polynomials in the one unknown that an elimination leaves: (c, s) of a turning joint, or the slide d.

Monomials are (power of c, power of s), with s^2 written as 1 - c^2, or (power of d, 0).
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Matrix, Vector
from codegen.program import Builder, Node

Terms = tuple[tuple[tuple[int, int], Node], ...]


@dataclass(frozen=True, slots=True)
class Poly:
    terms: Terms

    def coefficient(self, monomial: tuple[int, int], zero: Node) -> Node:
        return dict(self.terms).get(monomial, zero)

    @property
    def degree(self) -> int:
        return max((i + j for (i, j), _ in self.terms), default=0)


PolyVector = tuple[Poly, Poly, Poly]


class Algebra:
    """Arithmetic of polynomials; `turns` tells whether s^2 is to be replaced."""

    def __init__(self, builder: Builder, turns: bool) -> None:
        self.b = builder
        self.turns = turns

    def poly(self, terms: dict[tuple[int, int], Node]) -> Poly:
        return Poly(tuple(sorted(((m, n) for m, n in terms.items() if not n.is_exactly(0)), key=lambda t: t[0])))

    def constant(self, node: Node) -> Poly:
        return self.poly({(0, 0): node})

    def add(self, *polys: Poly) -> Poly:
        gathered: dict[tuple[int, int], list[Node]] = {}
        for poly in polys:
            for monomial, node in poly.terms:
                gathered.setdefault(monomial, []).append(node)
        return self.poly({m: self.b.add(*nodes) for m, nodes in gathered.items()})

    def scale(self, poly: Poly, k: Node) -> Poly:
        return self.poly({m: self.b.mul(k, n) for m, n in poly.terms})

    def neg(self, poly: Poly) -> Poly:
        return self.scale(poly, self.b.integer(-1))

    def sub(self, left: Poly, right: Poly) -> Poly:
        return self.add(left, self.neg(right))

    def mul(self, left: Poly, right: Poly) -> Poly:
        gathered: dict[tuple[int, int], list[Node]] = {}
        for (i, j), a in left.terms:
            for (k, m), c in right.terms:
                self._gather(gathered, (i + k, j + m), self.b.mul(a, c))
        return self.poly({m: self.b.add(*nodes) for m, nodes in gathered.items()})

    def _gather(self, gathered: dict[tuple[int, int], list[Node]], monomial: tuple[int, int], node: Node) -> None:
        i, j = monomial
        if self.turns and j >= 2:
            self._gather(gathered, (i, j - 2), node)
            self._gather(gathered, (i + 2, j - 2), self.b.neg(node))
        else:
            gathered.setdefault(monomial, []).append(node)

    def dot(self, vector: Vector, polys: PolyVector) -> Poly:
        return self.add(*(self.scale(p, k) for k, p in zip(vector, polys, strict=True)))

    def times(self, matrix: Matrix, polys: PolyVector) -> PolyVector:
        return (self.dot(matrix[0], polys), self.dot(matrix[1], polys), self.dot(matrix[2], polys))

    def plus(self, polys: PolyVector, vector: Vector) -> PolyVector:
        first, second, third = (self.add(p, self.constant(k)) for p, k in zip(polys, vector, strict=True))
        return (first, second, third)

    def moved_by_joint(self, v: Vector, sign: int) -> PolyVector:
        """A known vector moved by the unknown joint, turned about z or slid along it."""
        b = self.b
        if not self.turns:
            slid = self.poly({(0, 0): v[2], (1, 0): b.integer(sign)})
            return (self.constant(v[0]), self.constant(v[1]), slid)
        s = b.integer(sign)
        x = self.poly({(1, 0): v[0], (0, 1): b.neg(b.mul(s, v[1]))})
        y = self.poly({(1, 0): v[1], (0, 1): b.mul(s, v[0])})
        return (x, y, self.constant(v[2]))
