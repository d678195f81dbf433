"""Every loop of the generated C with the most passes that it makes, read from its head."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

_FUNCTION = re.compile(r"^(?:\w+ )+\*?(\w+)\([^;{]*\)\n\{", re.M)
_LOOP = re.compile(r"\b(?:for \(([^\n]*)\) \{|while \(|do \{)")
_HEAD = re.compile(r"\w+(?: \w+)* (\w+) = ([^;]+); ([^;]+); (\+\+|--)\1")
_BOUND = re.compile(r"(\w+) (<=|<|>=|>) ([^()&|]+)")
_DEFINED = re.compile(r"#define (\w+)\s+(\d+)u?\b")
_LISTED = re.compile(r"^    ([A-Z][A-Z0-9_]*) = (0x[0-9A-F]+|\d+)u?,?(?:\s|$)", re.M)  # in an enum
_TERM = re.compile(r"(0x[0-9A-Fa-f]+|\d+)u?")


@dataclass(frozen=True, slots=True)
class Loop:
    """`passes` is the most that one run of the loop makes; None where its head does not tell."""

    function: str
    line: int
    head: str
    passes: int | None


def loops_of(files: Mapping[str, str], prefix: str) -> tuple[Loop, ...]:
    """The loops of `<prefix>_kin.c` in the order of the text."""
    text = files[f"{prefix}_kin.c"]
    pairs = _DEFINED.findall(files[f"{prefix}_kin.h"] + text) + _LISTED.findall(text)
    named = {name: int(value, 0) for name, value in pairs}
    return tuple(_loops(text, named))


def _loops(text: str, named: dict[str, int]) -> Iterator[Loop]:
    """`named` also learns the largest value of each counter, for inner loops that run up to it."""
    functions = [(match.start(), match[1]) for match in _FUNCTION.finditer(text)]
    for match in _LOOP.finditer(text):
        function = next((name for start, name in reversed(functions) if start < match.start()), "")
        line = text.count("\n", 0, match.start()) + 1
        yield Loop(function, line, match[0].removesuffix(" {"), _passes(match[1] or "", named))


def _passes(head: str, named: dict[str, int]) -> int | None:
    """Between the first value of the counter and the bound that is a number; further conditions only end it sooner."""
    found = _HEAD.fullmatch(head)
    if found is None:
        return None
    counter, first, condition, step = found.groups()
    condition = condition.replace("(unsigned)", "")
    # a counter of an outer loop may be as small as its own first value: 0 bounds the passes
    start = _number(first, {name: 0 if name.islower() else value for name, value in named.items()})
    bounds = [_number(bound[3], named) for bound in _BOUND.finditer(condition) if bound[1] == counter]
    ends = [bound for bound in bounds if bound is not None]
    if start is None or not ends:
        return None
    within = "=" in condition.split(counter, 1)[1][:4]
    if step == "--":
        named[counter] = start
        return start - ends[0] + int(within)
    named[counter] = ends[0] if within else ends[0] - 1
    return named[counter] - start + 1


def _number(text: str, named: Mapping[str, int]) -> int | None:
    """A sum of numbers and names."""
    total = 0
    for sign, word in re.findall(r"(^|[+-]) ?(\w+)", text.strip()):
        plain = _TERM.fullmatch(word)
        value = int(plain[1], 0) if plain else named.get(word)
        if value is None:
            return None
        total += -value if sign == "-" else value
    return total
