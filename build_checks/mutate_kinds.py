"""The faults that are planted in the generated C: each kind finds every place where it can stand.

Places are found by the shape of the code (a call, a sum, a condition, a number), not by names, but for the few names
that stand for one thing in every generated file: FULL_TURN, seed, and the tolerances.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from enum import Enum

from build_checks.mutate_tokens import Source, Token


class Kind(Enum):
    ARGUMENTS = "two arguments exchanged (atan2)"
    SIGN = "a sign flipped in a sum, or dropped"
    CONSTANT = "a constant wrong in the sixth digit"
    COEFFICIENT = "a coefficient of the mathematics wrong in the second digit"
    LIMIT = "a limit off by more than rounding explains"
    TOLERANCE = "a tolerance a thousand times as large, or zero"
    BRANCH = "a condition always true, or never"
    GUARD = "a part of a condition missing"
    CLAMP = "a choice that always takes one side"
    CHOICE = "the two sides of a choice exchanged"
    PAIR = "cosine and sine exchanged"
    SEED = "a seed missing"
    TURNS = "one full turn too many"
    COMPARISON = "a comparison the wrong way round"
    STATEMENT = "a statement missing"
    INDEX = "an index off by one"
    INTEGER = "a whole number off by one"


@dataclass(frozen=True, slots=True)
class Edit:
    """Characters start..end replaced."""

    start: int
    end: int
    text: str


@dataclass(frozen=True, slots=True)
class Mutant:
    """One fault: where it stands, and what it does to the text."""

    kind: Kind
    function: str
    line: int
    edit: Edit
    before: str

    def planted(self, text: str) -> str:
        return text[: self.edit.start] + self.edit.text + text[self.edit.end :]

    def __str__(self) -> str:
        place = self.function or "file scope"
        return f"line {self.line}, {place}: {self.kind.name}: {self.before} -> {self.edit.text or 'nothing'}"


Found = Iterator[tuple[int, int, str]]  # the tokens first..last, and the text to put there

_CONSTANT_SHIFT, _COEFFICIENT_SHIFT, _LIMIT_SHIFT = 1e-5, 3e-2, {"f": 5e-6, "": 5e-14}
_TOLERANCE_NAME = re.compile(r"FAR|SLACK|FLAT|LEAST_\w+")
_COEFFICIENT_NAME = re.compile(r"[a-z]\d+")
_HUGE = 1e29  # stands for no limit
_OPPOSITE = {"<": ">", ">": "<", "<=": ">=", ">=": "<=", "==": "!=", "!=": "=="}
_EDGES = frozenset(("(", ")", "{", "}", "[", "]", ",", ";", "?", ":", "=", "return", "&&", "||", "|=", "+=", "-="))
_STARTS = frozenset((";", "{", "}"))
_JUMPS = frozenset(("return", "break", "continue", "goto", "else", "do", "case", "default"))
_HEADS = frozenset(("if", "for", "while", "switch"))


def mutants(source: Source, lines: frozenset[int]) -> list[Mutant]:
    """Every fault of every kind on the given lines, in the order of the text."""
    found = [
        Mutant(kind, here.function, here.line, _edit(source, first, last, text), source.between(first, last))
        for kind, finder in _FINDERS
        for first, last, text in finder(source)
        if (here := source.tokens[first]).line in lines
    ]
    return sorted(found, key=lambda mutant: (mutant.line, mutant.edit.start, mutant.kind.name, mutant.edit.text))


def _edit(source: Source, first: int, last: int, text: str) -> Edit:
    return Edit(source.tokens[first].start, source.tokens[last].end, text)


def _inside(source: Source) -> Iterator[tuple[int, Token]]:
    """Tokens of function bodies with their indices."""
    return ((i, token) for i, token in enumerate(source.tokens) if token.function)


def _text(source: Source, index: int) -> str:
    return source.tokens[index].text


def _ends_value(source: Source, index: int) -> bool:
    """Whether the token ends a value, so that a + or - behind it is that of a sum."""
    token = source.tokens[index]
    return token.kind == "number" or token.text in (")", "]") or (token.kind == "word" and token.text != "return")


# --- arguments ---


def _arguments(source: Source) -> Found:
    """Neighbouring arguments of the real type, exchanged in every call."""
    takers = {name: places for name, places in _parameters(source).items() if places}
    for i, token in _inside(source):
        if token.text in takers and _text(source, i + 1) == "(":
            parts = _parts(source, i + 1)
            for place in takers[token.text]:
                (a, b), (c, d) = parts[place], parts[place + 1]
                if source.between(a, b) != source.between(c, d):
                    yield a, d, f"{source.between(c, d)}, {source.between(a, b)}"


def _parameters(source: Source) -> dict[str, list[int]]:
    """Of each function defined here: places of two neighbouring parameters that are both `<prefix>_real`."""
    found = {}
    for i, token in enumerate(source.tokens):
        if token.text == "{" and token.function and _text(source, i - 1) == ")":
            opened = source.partner[i - 1]
            if source.tokens[opened].function == "":
                kinds = [_is_real(source, first, last) for first, last in _parts(source, opened)]
                found[token.function] = [k for k in range(len(kinds) - 1) if kinds[k] and kinds[k + 1]]
    return found


def _is_real(source: Source, first: int, last: int) -> bool:
    return re.fullmatch(r"(const )?\w+_real \w+", source.between(first, last)) is not None


def _parts(source: Source, opened: int) -> list[tuple[int, int]]:
    """First and last token of each argument between brackets."""
    found, start, i = [], opened + 1, opened + 1
    closed = source.partner[opened]
    while i <= closed:
        if i == closed or source.tokens[i].text == ",":
            found.append((start, i - 1))
            start = i + 1
        i = source.partner[i] + 1 if source.tokens[i].text in ("(", "[", "{") else i + 1
    return found


# --- signs and numbers ---


def _signs(source: Source) -> Found:
    for i, token in _inside(source):
        if token.text in ("+", "-") and _ends_value(source, i - 1):
            yield i, i, "-" if token.text == "+" else "+"
        elif token.text == "-":
            yield i, i, ""
        elif token.text in ("+=", "-="):
            yield i, i, "-=" if token.text == "+=" else "+="
    for i, token in enumerate(source.tokens):
        if not token.function and token.text == "-" and source.tokens[i + 1].kind == "number":
            yield i, i, ""


def _constants(source: Source) -> Found:
    for i, token, value in _reals(source):
        plain = _name_of(source, i) is None or not (_is_coefficient(source, i) or _is_tolerance(source, i))
        if plain and value != 0 and not _is_limit(source, i):
            yield i, i, _printed(value * (1 + _CONSTANT_SHIFT), token)


def _coefficients(source: Source) -> Found:
    for i, token, value in _reals(source):
        if _is_coefficient(source, i):
            yield i, i, _printed(value * (1 + _COEFFICIENT_SHIFT), token)


def _tolerances(source: Source) -> Found:
    for i, token, value in _reals(source):
        if _is_tolerance(source, i):
            yield i, i, _printed(value * 1024, token)
            yield i, i, _printed(0.0, token)


def _limits(source: Source) -> Found:
    for i, token, value in _reals(source):
        if _is_limit(source, i) and abs(value) < _HUGE:
            step = _LIMIT_SHIFT["f" if token.text.endswith("f") else ""]
            yield i, i, _printed(value + step, token)
            yield i, i, _printed(value - step, token)


def _reals(source: Source) -> Iterator[tuple[int, Token, float]]:
    for i, token in enumerate(source.tokens):
        if token.kind == "number" and re.search(r"[.eE]", token.text) and not token.text.startswith("0x"):
            yield i, token, float(token.text.rstrip("fF"))


def _printed(value: float, like: Token) -> str:
    return f"({value!r}{'f' if like.text.endswith('f') else ''})"


def _name_of(source: Source, i: int) -> str | None:
    """The name in `NAME = number` or `NAME = -number`."""
    before = i - 1 if _text(source, i - 1) == "-" else i
    return _text(source, before - 2) if _text(source, before - 1) == "=" else None


def _is_coefficient(source: Source, i: int) -> bool:
    name = _name_of(source, i)
    return bool(source.tokens[i].function and name and _COEFFICIENT_NAME.fullmatch(name))


def _is_tolerance(source: Source, i: int) -> bool:
    name = _name_of(source, i)
    return bool(not source.tokens[i].function and name and _TOLERANCE_NAME.fullmatch(name))


def _is_limit(source: Source, i: int) -> bool:
    """One of the first two numbers of a row in a table at file scope."""
    if source.tokens[i].function:
        return False
    j = i - 1 if _text(source, i - 1) == "-" else i
    if _text(source, j - 1) == "{":
        return True
    k = j - 3 if _text(source, j - 3) == "-" else j - 2
    return _text(source, j - 1) == "," and (_text(source, k) == "{" or _text(source, k - 1) == "{")


def _integers(source: Source) -> Found:
    for i, token, value in _whole_numbers(source):
        if _text(source, i - 1) != "[":
            suffix = token.text[len(token.text.rstrip("uUlL")) :]
            yield i, i, f"{value + 1}{suffix}"


def _indices(source: Source) -> Found:
    for i, token, value in _whole_numbers(source):
        if token.function and _text(source, i - 1) == "[" and _text(source, i + 1) == "]":
            yield i, i, str(value - 1 if value else 1)


def _whole_numbers(source: Source) -> Iterator[tuple[int, Token, int]]:
    for i, token in enumerate(source.tokens):
        whole = re.fullmatch(r"(0[xX][0-9a-fA-F]+|\d+)[uUlL]*", token.text)
        if token.kind == "number" and whole and (token.function or _text(source, i - 1) == "="):
            yield i, token, int(whole[1], 0)


# --- conditions ---


def _branches(source: Source) -> Found:
    for i, token in _inside(source):
        if token.text in ("if", "while"):
            opened = i + 1
            yield opened, source.partner[opened], "(0)"
            if token.text == "if":
                yield opened, source.partner[opened], "(1)"


def _guards(source: Source) -> Found:
    """One side of a && or || gone."""
    for i, token in _inside(source):
        if token.text in ("&&", "||"):
            yield _left_end(source, i - 1), i, ""
            yield i, _right_end(source, i + 1), ""


def _left_end(source: Source, i: int) -> int:
    """The first token of the operand that ends with token i."""
    while True:
        if source.tokens[i].text in (")", "]"):
            i = source.partner[i]
        if source.tokens[i - 1].text in _EDGES - {")", "]"}:
            return i
        i -= 1


def _right_end(source: Source, i: int) -> int:
    while True:
        if source.tokens[i].text in ("(", "["):
            i = source.partner[i]
        if source.tokens[i + 1].text in _EDGES - {"(", "["}:
            return i
        i += 1


def _choices(source: Source) -> Iterator[tuple[int, int, tuple[int, int], tuple[int, int]]]:
    """Each `c ? a : b`: first token of c, the `?`, and the ends of a and of b."""
    for i, token in _inside(source):
        if token.text == "?":
            colon = _colon(source, i + 1)
            first = _left_end_of_condition(source, i - 1)
            yield first, i, (i + 1, colon - 1), (colon + 1, _right_end(source, colon + 1))


def _colon(source: Source, i: int) -> int:
    while source.tokens[i].text != ":":
        i = source.partner[i] + 1 if source.tokens[i].text in ("(", "[") else i + 1
    return i


def _left_end_of_condition(source: Source, i: int) -> int:
    """As _left_end, with && and || inside."""
    while True:
        i = _left_end(source, i)
        if source.tokens[i - 1].text not in ("&&", "||"):
            return i
        i -= 2


def _clamps(source: Source) -> Found:
    for first, _, (a, b), (c, d) in _choices(source):
        yield first, d, source.between(a, b)
        yield first, d, source.between(c, d)


def _flipped(source: Source) -> Found:
    for _, mark, (a, b), (c, d) in _choices(source):
        yield mark + 1, d, f"{source.between(c, d)} : {source.between(a, b)}"


def _comparisons(source: Source) -> Found:
    for i, token in _inside(source):
        if token.text in _OPPOSITE:
            yield i, i, _OPPOSITE[token.text]


# --- what kinematics adds ---


def _pairs(source: Source) -> Found:
    for i, token in _inside(source):
        if token.text in ("c", "s") and _text(source, i - 1) in (".", "->"):
            yield i, i, "s" if token.text == "c" else "c"


def _seeds(source: Source) -> Found:
    for i, token in _inside(source):
        if token.text == "seed" and _text(source, i + 1) == "[":
            start = i - 2 if _text(source, i - 1) in (".", "->") else i
            yield start, source.partner[i + 1], "0"


def _turns(source: Source) -> Found:
    for i, token in _inside(source):
        if token.text == "FULL_TURN":
            yield i, i, "FULL_TURN + FULL_TURN"


def _statements(source: Source) -> Found:
    """Assignments and calls that stand for themselves."""
    for i, token in _inside(source):
        if _text(source, i - 1) in _STARTS and token.text not in _STARTS and not _in_head(source, i):
            end = i
            while source.tokens[end].text not in (";", "{"):
                end = source.partner[end] + 1 if source.tokens[end].text in ("(", "[") else end + 1
            if source.tokens[end].text == ";" and not _is_kept(source, i):
                yield i, end, ";"


def _in_head(source: Source, i: int) -> bool:
    """Whether the `;` before the token is one of a for's head: the next bracket that closes is a round one."""
    while source.tokens[i].text not in (")", "}"):
        i = source.partner[i] + 1 if source.tokens[i].text in ("(", "{") else i + 1
    return source.tokens[i].text == ")"


def _is_kept(source: Source, i: int) -> bool:
    """Declarations, jumps and heads stay."""
    first, second = source.tokens[i], source.tokens[i + 1]
    declares = first.text in ("const", "static") or (first.kind == "word" and second.kind == "word")
    points = first.kind == "word" and second.text == "*" and source.tokens[i + 2].kind == "word"
    return declares or points or first.text in _JUMPS | _HEADS


_FINDERS: tuple[tuple[Kind, Callable[[Source], Found]], ...] = (
    (Kind.ARGUMENTS, _arguments),
    (Kind.SIGN, _signs),
    (Kind.CONSTANT, _constants),
    (Kind.COEFFICIENT, _coefficients),
    (Kind.LIMIT, _limits),
    (Kind.TOLERANCE, _tolerances),
    (Kind.BRANCH, _branches),
    (Kind.GUARD, _guards),
    (Kind.CLAMP, _clamps),
    (Kind.CHOICE, _flipped),
    (Kind.PAIR, _pairs),
    (Kind.SEED, _seeds),
    (Kind.TURNS, _turns),
    (Kind.COMPARISON, _comparisons),
    (Kind.STATEMENT, _statements),
    (Kind.INDEX, _indices),
    (Kind.INTEGER, _integers),
)
