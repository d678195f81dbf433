"""Constants as a reader sees them: by their name in the link table, or as the formula that combines such names.

The formula is tidied (signs pulled out, powers, one fraction line) and printed only where it gives the constant's value
back to 40 digits; else the number itself is.
"""

from __future__ import annotations

import ast
import re
from collections import Counter
from dataclasses import dataclass
from fractions import Fraction

from codegen.exact import MP, Real, real
from codegen.program import Node

_SAME = MP.mpf(10) ** -40
_RECIPROCAL = re.compile(r"1/([A-Z]\w*(?:\*[A-Z]\w*)+)")  # of a product, which may stand there without brackets


def constant_formula(node: Node, values: dict[str, Real]) -> str:
    """The text of a constant; `values` holds the named constants."""
    if node.structural or node.name:
        return node.label
    for formula in (node.text, _RECIPROCAL.sub(r"1/(\1)", node.text)):
        try:
            text = _read(formula).text()
            value = _read(text).value(values)
        except (SyntaxError, KeyError):
            continue
        if abs(value - node.value) <= _SAME * (1 + abs(node.value)):
            return text
    return number_text(node.value)


def _read(text: str) -> _Product:
    return _product(ast.parse(text.strip().replace("^", "**"), mode="eval").body)


def number_text(value: Real) -> str:
    """Seventeen digits: enough for the double of the value."""
    text: str = MP.nstr(MP.mpf(value), 17, min_fixed=-6, max_fixed=15)
    return text.removesuffix(".0")


@dataclass(frozen=True, slots=True)
class _Atom:
    """A name, or the square root of something."""

    name: str = ""
    inner: _Product | None = None

    def text(self) -> str:
        return f"sqrt({self.inner.text()})" if self.inner else self.name

    def value(self, values: dict[str, Real]) -> Real:
        return MP.sqrt(self.inner.value(values)) if self.inner else values[self.name]


@dataclass(frozen=True, slots=True)
class _Sum:
    terms: tuple[_Product, ...]

    def text(self) -> str:
        first, *rest = sorted(self.terms, key=lambda term: term.factor < 0)  # a positive one first, if there is one
        return first.text() + "".join(f" {'-' if t.factor < 0 else '+'} {t.absolute().text()}" for t in rest)

    def value(self, values: dict[str, Real]) -> Real:
        return sum((term.value(values) for term in self.terms), MP.mpf(0))


@dataclass(frozen=True, slots=True)
class _Product:
    """factor * above / below."""

    factor: Fraction
    above: tuple[_Atom | _Sum, ...] = ()
    below: tuple[_Atom | _Sum, ...] = ()

    def absolute(self) -> _Product:
        return _Product(abs(self.factor), self.above, self.below)

    def value(self, values: dict[str, Real]) -> Real:
        total = real(self.factor)
        for part in self.above:
            total = total * part.value(values)
        for part in self.below:
            total = total / part.value(values)
        return total

    def text(self) -> str:
        sign = "-" if self.factor < 0 else ""
        number = abs(self.factor)
        if number == 1 and len(self.above) == 1 and not sign and not self.below:
            return self.above[0].text()
        above, below = _factors(number.numerator, self.above), _factors(number.denominator, self.below)
        if not below:
            return f"{sign}{'*'.join(above) or 1}"
        divisor = f"({'*'.join(below)})" if len(below) > 1 else below[0]
        return f"{sign}{'*'.join(above) or 1}/{divisor}"


def _factors(number: int, parts: tuple[_Atom | _Sum, ...]) -> list[str]:
    """Equal factors as a power, sums in brackets; nothing stands for 1."""
    counts = Counter(f"({part.text()})" if isinstance(part, _Sum) else part.text() for part in parts)
    texts = [f"{text}^{count}" if count > 1 else text for text, count in counts.items()]
    return [str(number), *texts] if number != 1 else texts


def _product(tree: ast.expr) -> _Product:
    """A constant's formula, tidied; KeyError on what such a formula does not hold."""
    match tree:
        case ast.Name(id=name):
            return _Product(Fraction(1), (_Atom(name),))
        case ast.Constant(value=int() as number):
            return _Product(Fraction(number))
        case ast.UnaryOp(op=ast.USub(), operand=operand):
            return _times(_Product(Fraction(-1)), _product(operand))
        case ast.BinOp(left=left, op=ast.Mult(), right=right):
            return _times(_product(left), _product(right))
        case ast.BinOp(left=left, op=ast.Div(), right=right):
            divisor = _product(right)
            return _times(_product(left), _Product(1 / divisor.factor, divisor.below, divisor.above))
        case ast.BinOp(left=left, op=ast.Pow(), right=ast.Constant(value=int() as count)):
            base = _product(left)
            return _Product(base.factor**count, base.above * count, base.below * count)
        case ast.BinOp(left=left, op=ast.Add() | ast.Sub() as operator, right=right):
            second = _product(right)
            if isinstance(operator, ast.Sub):
                second = _times(_Product(Fraction(-1)), second)
            return _sum((*_terms(_product(left)), *_terms(second)))
        case ast.Call(func=ast.Name(id="sqrt"), args=[inner]):
            return _Product(Fraction(1), (_Atom(inner=_product(inner)),))
    raise KeyError(ast.dump(tree))


def _times(left: _Product, right: _Product) -> _Product:
    return _Product(left.factor * right.factor, _squared(left.above + right.above), _squared(left.below + right.below))


def _squared(parts: tuple[_Atom | _Sum, ...]) -> tuple[_Atom | _Sum, ...]:
    """A root that stands twice is what is under it, where that is a plain sum."""
    for part in parts:
        match part:
            case _Atom(inner=_Product(factor=Fraction(numerator=1, denominator=1), above=(_Sum() as under,), below=())):
                if parts.count(part) > 1:
                    rest = list(parts)
                    rest.remove(part)
                    rest.remove(part)
                    return _squared((*rest, under))
    return parts


def _terms(product: _Product) -> tuple[_Product, ...]:
    """A bare sum is opened."""
    match product:
        case _Product(factor=factor, above=(_Sum(terms=terms),), below=()) if abs(factor) == 1:
            return tuple(_Product(term.factor * factor, term.above, term.below) for term in terms)
    return (product,)


def _sum(terms: tuple[_Product, ...]) -> _Product:
    """A sum of negative terms only is minus the sum of the others."""
    if all(term.factor < 0 for term in terms):
        return _Product(Fraction(-1), (_Sum(tuple(term.absolute() for term in terms)),))
    return _Product(Fraction(1), (_Sum(terms),))
