"""Every loop of the generated C with the most passes that it makes, read from its head."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

_FUNCTION = re.compile(r"^(?:\w+ )+\*?(\w+)\([^;{]*\)\n\{", re.M)
_LOOP = re.compile(r"\b(?:for \(([^\n]*)\) \{|while \(|do \{)")
_HEAD = re.compile(r"(?:unsigned|int|\w+) (\w+) = (\w+); (?:[^;]*\()?\1 (<=?) (\w+)\)?; (?:\+\+\1|\1\+\+)")
_NAMED = re.compile(r"#define (\w+)\s+(\d+)u?\b")


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
    named = {name: int(value) for name, value in _NAMED.findall(files[f"{prefix}_kin.h"] + text)}
    return tuple(_loops(text, named))


def _loops(text: str, named: dict[str, int]) -> Iterator[Loop]:
    """`named` also learns the largest value of each counter, for inner loops that run up to it."""
    functions = [(match.start(), match[1]) for match in _FUNCTION.finditer(text)]
    for match in _LOOP.finditer(text):
        function = next((name for start, name in reversed(functions) if start < match.start()), "")
        line = text.count("\n", 0, match.start()) + 1
        yield Loop(function, line, match[0].removesuffix(" {"), _passes(match[1] or "", named))


def _passes(head: str, named: dict[str, int]) -> int | None:
    found = _HEAD.fullmatch(head)
    if found is None:
        return None
    start, end = (_number(word, named) for word in (found[2], found[4]))
    if start is None or end is None:
        return None
    named[found[1]] = end if found[3] == "<=" else end - 1
    return named[found[1]] - start + 1


def _number(word: str, named: Mapping[str, int]) -> int | None:
    plain = word.removesuffix("u")
    return int(plain) if plain.isdigit() else named.get(word)
