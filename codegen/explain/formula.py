"""Values of a program as lines of formulas: `name = expression`, each named value before its first use.

The language is that of a pocket calculator: + - * / ^ sqrt() abs(), and `a if t > 0 else b`. A value gets a name where
it is read twice or where a line would become too long: the derivation's own name for it, if there is one.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field

from codegen.exact import Real
from codegen.explain.constant_text import constant_formula
from codegen.program import Builder, Node, Op

_LONGEST = 88  # characters of one expression before its parts get names
_LONGEST_CONSTANT = 40
_WIDTH = 100
_LEAST_LINE = 30


@dataclass(frozen=True, slots=True)
class Line:
    """name = text, with what it is; `name` may be empty for a line that only says something."""

    name: str
    text: str
    note: str = ""


@dataclass
class Sheet:
    """The lines written so far and the names that values have.

    leaves  names of inputs where a reader should see another than their own
    """

    builder: Builder
    leaves: dict[Node, str] = field(default_factory=dict)
    taken: set[str] = field(default_factory=set)
    names: dict[Node, str] = field(default_factory=dict)
    uses: Counter[Node] = field(default_factory=Counter)
    lines: list[Line] = field(default_factory=list)
    counted: int = 0

    def __post_init__(self) -> None:
        self._constants: dict[str, Real] = {
            node.name: node.value for node in self.builder.nodes.values() if node.is_constant and node.name
        }

    def plan_uses(self, roots: Iterable[Node]) -> None:
        """Count how often each value will be read."""
        for root in roots:
            self.uses[root] += 1
            if self.uses[root] == 1:
                self.plan_uses(root.args)

    def take(self) -> list[Line]:
        """The lines since the last call."""
        lines, self.lines = self.lines, []
        return lines

    def say(self, name: str, text: str, note: str = "") -> None:
        self.lines.append(Line(name, text, note))

    # -- names -------------------------------------------------------------------------------------------------------
    def define(self, wanted: str, node: Node, note: str = "") -> str:
        """A line that gives the value this name, unless it has one; the name by which it is known now."""
        if node in self.names:
            return self.names[node]
        self._ready(node)
        name = self._free(wanted)
        self.say(name, self.text(node), note or self.builder.notes.get(node, ""))
        plain = node.op is Op.INPUT or node.is_negation or node.structural or bool(node.name)
        if not plain:
            self.names[node] = name
        return name

    def alias(self, wanted: str, node: Node, note: str = "") -> str:
        """As `define`, with a line under this name even where the value has another; this name."""
        known = self.define(wanted, node, note)
        if known != wanted:
            self.say(self._free(wanted), known, note)
        return wanted

    def value(self, node: Node) -> str:
        """The expression of a value, what it needs being defined before."""
        if node not in self.names:
            self._ready(node)
            if self._deserves_name(node):
                self._name(node)
        return self.text(node)

    def _free(self, wanted: str) -> str:
        name, count = wanted, 1
        while name in self.taken:
            count += 1
            name = f"{wanted}_{count}"
        self.taken.add(name)
        return name

    def _name(self, node: Node) -> None:
        if node.is_constant:
            wanted = "K1"
        elif node in self.builder.names:
            wanted = self.builder.names[node]
        else:
            self.counted += 1
            wanted = f"t{self.counted}"
        while wanted in self.taken and wanted[0] == "K":
            wanted = f"K{int(wanted[1:]) + 1}"
        name = self._free(wanted)
        self.say(name, self.text(node), self.builder.notes.get(node, ""))
        self.names[node] = name

    def _ready(self, node: Node) -> None:
        for arg in node.args:
            if arg not in self.names:
                self._ready(arg)
                if self._deserves_name(arg):
                    self._name(arg)

    def _deserves_name(self, node: Node) -> bool:
        if node.op is Op.INPUT or node.is_negation:
            return False
        if node.is_constant:
            return not node.name and len(self.text(node)) > _LONGEST_CONSTANT
        return self.uses[node] > 1 or len(self.text(node)) > _LONGEST

    # -- text --------------------------------------------------------------------------------------------------------
    def text(self, node: Node) -> str:
        minus, text = self._signed(node)
        return f"-{_bracketed(text)}" if minus else text

    def _signed(self, node: Node) -> tuple[bool, str]:
        """(whether it is the negative of the text, the text)."""
        if node in self.names:
            return False, self.names[node]
        match node.op:
            case Op.CONSTANT:
                text = constant_formula(node, self._constants)
                leading = text.startswith("-") and not _is_sum_text(text[1:])
                return (True, text[1:]) if leading else (False, text)
            case Op.INPUT:
                return False, self.leaves.get(node, node.name)
            case Op.SUM:
                return self._sum(node)
            case Op.PRODUCT:
                return self._product(*node.args)
            case Op.QUOTIENT:
                above, below = (self._factor(arg) for arg in node.args)
                tight = f"({below[1]})" if re.search(r"[*/]", below[1]) and below[1][0] != "(" else below[1]
                return above[0] != below[0], f"{above[1]}/{tight}"
            case Op.ROOT:
                return False, f"sqrt({self.text(node.args[0])})"
            case Op.SIZE:
                return False, f"abs({self.text(node.args[0])})"
            case Op.CHOICE:
                test, above_zero, otherwise = (self.text(arg) for arg in node.args)
                return False, f"({above_zero} if {test} > 0 else {otherwise})"

    def _product(self, left: Node, right: Node) -> tuple[bool, str]:
        first, second = self._factor(left), self._factor(right)
        if left is right:
            base = first[1] if re.fullmatch(r"[\w.\[\]]+|\([^()]*\)", first[1]) else f"({first[1]})"
            return False, f"{base}^2"
        one, other = sorted((first[1], second[1]), key=lambda text: text.startswith("1/"))
        product = f"{one}{other[1:]}" if other.startswith("1/") else f"{one}*{other}"
        return first[0] != second[0], product

    def _factor(self, node: Node) -> tuple[bool, str]:
        minus, text = self._signed(node)
        return minus, _bracketed(text)

    def _sum(self, node: Node) -> tuple[bool, str]:
        """Inner sums are opened; a positive term stands first; only negative ones are minus their sum."""
        terms = self._terms(node)
        if all(minus for minus, _ in terms):
            return True, " + ".join(text for _, text in terms)
        first = next(k for k, (minus, _) in enumerate(terms) if not minus)
        rest = [*terms[:first], *terms[first + 1 :]]
        joined = "".join(f" - {_bracketed(text)}" if minus else f" + {text}" for minus, text in rest)
        return False, terms[first][1] + joined

    def _terms(self, node: Node) -> list[tuple[bool, str]]:
        found: list[tuple[bool, str]] = []
        for sign, arg in zip(node.signs, node.args, strict=True):
            opened = arg.op is Op.SUM and arg not in self.names
            inner = self._terms(arg) if opened else [self._signed(arg)]
            found += [(minus != (sign < 0), text) for minus, text in inner]
        return found


def _bracketed(text: str) -> str:
    return f"({text})" if _is_sum_text(text) else text


def _is_sum_text(text: str) -> bool:
    """Whether a sign stands between terms outside all brackets."""
    bare = text
    while (shorter := re.sub(r"\([^()]*\)", "", bare)) != bare:
        bare = shorter
    return " + " in bare or " - " in bare


def printed(lines: Iterable[Line]) -> list[str]:
    """Lines of text, long ones continued with a deeper indent, notes behind #."""
    shown: list[str] = []
    for line in lines:
        start = f"{line.name} = {line.text}" if line.name else line.text
        note = f"   # {line.note}" if line.note and line.note != line.text else ""
        if len(start) + len(note) <= _WIDTH:
            shown.append(start + note)
            continue
        if note:
            shown.append(note.strip())
        shown.extend(_wrapped(start))
    return shown


def _wrapped(text: str) -> list[str]:
    """Broken before a sign outside brackets, else before any sign, else before a product."""
    pieces: list[str] = []
    indent = ""
    while len(indent + text) > _WIDTH:
        cut = _break_place(text, _WIDTH - len(indent))
        if cut < 0:
            break
        pieces.append(indent + text[:cut].rstrip())
        indent, text = "    ", text[cut:].lstrip()
    return [*pieces, indent + text]


def _break_place(text: str, most: int) -> int:
    signs = [match.start() for match in re.finditer(r" [+-] ", text[:most]) if match.start() >= _LEAST_LINE]
    outside = [place for place in signs if text[:place].count("(") == text[:place].count(")")]
    if outside or signs:
        return max(outside or signs)
    return text.rfind("*", _LEAST_LINE, most)
