"""C text as tokens that know where they stand: enough to plant faults in it, whatever its names are."""

from __future__ import annotations

import re
import subprocess
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

_PARTS = re.compile(
    r"""
    (?P<comment>/\*.*?\*/ | //[^\n]*)
  | (?P<directive>^[ \t]*\#(?:[^\n\\]|\\.|\\\n)*)
  | (?P<string>"(?:[^"\\]|\\.)*" | '(?:[^'\\]|\\.)*')
  | (?P<number>(?:0[xX][0-9a-fA-F]+|(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)[uUlLfF]*)
  | (?P<word>[A-Za-z_]\w*)
  | (?P<sign>->|\+\+|--|<<=|>>=|<<|>>|<=|>=|==|!=|&&|\|\||[-+*/%&|^]=|[^\s\w])
    """,
    re.M | re.S | re.X,
)
_PAIRS = {"(": ")", "[": "]", "{": "}"}


@dataclass(frozen=True, slots=True)
class Token:
    """kind: "word", "number" or "sign"; function: "" at file scope."""

    kind: str
    text: str
    start: int
    end: int
    line: int
    function: str


@dataclass(frozen=True, slots=True)
class Source:
    """The code of a C file.

    tokens   without comments, strings and preprocessor lines
    partner  of each bracket's index, the index of the one that it belongs to
    """

    text: str
    tokens: tuple[Token, ...]
    partner: dict[int, int]

    def between(self, first: int, last: int) -> str:
        """The text from token `first` to token `last`, both included; "" when there are none."""
        return self.text[self.tokens[first].start : self.tokens[last].end] if first <= last else ""


def read_source(text: str) -> Source:
    plain = [(match.lastgroup or "", match[0], match.start()) for match in _PARTS.finditer(text)]
    rows = [(kind, word, start) for kind, word, start in plain if kind in ("word", "number", "sign")]
    partner = _partners([word for _, word, _ in rows])
    functions = _functions([word for _, word, _ in rows], partner)
    tokens = tuple(
        Token(kind, word, start, start + len(word), text.count("\n", 0, start) + 1, functions[place])
        for place, (kind, word, start) in enumerate(rows)
    )
    return Source(text, tokens, partner)


def _partners(words: Sequence[str]) -> dict[int, int]:
    found: dict[int, int] = {}
    waiting: list[int] = []
    for place, word in enumerate(words):
        if word in _PAIRS:
            waiting.append(place)
        elif word in _PAIRS.values():
            opened = waiting.pop()
            found[opened], found[place] = place, opened
    return found


def _functions(words: Sequence[str], partner: dict[int, int]) -> list[str]:
    """For each token the function whose body it stands in. A body is a `{` after the `)` of a parameter list."""
    names = [""] * len(words)
    place = 0
    while place < len(words):
        end = place
        if words[place] == "{":
            end = partner[place]
            if words[place - 1] == ")":
                name = words[partner[place - 1] - 1]
                names[place : end + 1] = [name] * (end + 1 - place)
        place = end + 1
    return names


def compiled_lines(folder: Path, file: str, flags: Sequence[str]) -> frozenset[int]:
    """Numbers of the lines that the preprocessor leaves in with these flags."""
    run = subprocess.run(["gcc", "-E", *flags, file], cwd=folder, capture_output=True, text=True, check=True)
    found: set[int] = set()
    here, number = False, 0
    for line in run.stdout.splitlines():
        marker = re.match(r'# (\d+) "([^"]*)"', line)
        if marker:
            number, here = int(marker[1]), marker[2] == file
            continue
        if here and line.strip():
            found.add(number)
        number += 1
    return frozenset(found)
