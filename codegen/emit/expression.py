"""Expressions of a program as C text: the only printer of arithmetic."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass, field

from codegen.emit.numbers import literal
from codegen.options import Options
from codegen.program import Builder, Node, Op

WIDTH = 108
_RANK = {Op.SUM: 1, Op.PRODUCT: 2, Op.QUOTIENT: 2, Op.CHOICE: 0}
_PURE_NUMBER = re.compile(r"^[-0-9/*+ ().sqrt]*$")


@dataclass
class Constants:
    """The named constants that the printed text uses, in the order in which it first uses them.

    Programs of several functions share them: a constant is known by its name, or by the formula that combines others.
    """

    options: Options
    names: dict[str, str] = field(default_factory=dict)
    nodes: dict[str, Node] = field(default_factory=dict)

    def text(self, node: Node) -> str:
        if node.structural or _PURE_NUMBER.match(node.label):
            return literal(node.value, self.options.real)
        if node.label not in self.names:
            derived = sum(not known.name for known in self.nodes.values())
            self.names[node.label] = node.name or f"COMBINED_{derived + 1}"
            self.nodes[node.label] = node
        return self.names[node.label]

    def declarations(self) -> list[tuple[str, str, str]]:
        """(name, literal, comment): the link table's numbers by name, then what combines them."""
        measured = sorted(label for label, node in self.nodes.items() if node.name)
        combined = [label for label, node in self.nodes.items() if not node.name]
        return [
            (self.names[label], literal(self.nodes[label].value, self.options.real), _comment(self.nodes[label]))
            for label in measured + combined
        ]


def _comment(node: Node) -> str:
    if len(node.text) <= 84:
        return node.text
    parts = sorted(set(re.findall(r"[A-Z][A-Z_0-9]*", node.text)))
    return "combines " + ", ".join(parts)


@dataclass
class Scope:
    """The values that have a name at a place in a function, and the lines that gave it to them."""

    builder: Builder
    constants: Constants
    options: Options
    indent: str = "    "
    names: dict[Node, str] = field(default_factory=dict)
    taken: set[str] = field(default_factory=set)
    uses: Counter[Node] = field(default_factory=Counter)
    lines: list[str] = field(default_factory=list)

    def plan_uses(self, roots: list[Node]) -> None:
        """Count how often each value will be read, so that what is read twice gets a name."""
        for root in roots:
            self._count(root)

    def _count(self, node: Node) -> None:
        self.uses[node] += 1
        if self.uses[node] == 1 and node not in self.names:
            for arg in node.args:
                self._count(arg)

    # -- lines -------------------------------------------------------------------------------------------------------
    def put(self, line: str) -> None:
        self.lines.extend(wrapped(self.indent + line) if line else [""])

    def ready(self, node: Node) -> None:
        """Give names to everything that the node needs and that deserves one."""
        for arg in node.args:
            if arg not in self.names:
                self.ready(arg)
                if self.deserves_name(arg):
                    self.name(arg)

    def deserves_name(self, node: Node) -> bool:
        if node in self.names or node.op in (Op.CONSTANT, Op.INPUT):
            return False
        if node.is_negation:
            return False
        return self.uses[node] > 1 or len(self.text(node)) > WIDTH

    def name(self, node: Node) -> str:
        """Declare the node as a local constant."""
        wanted = self.builder.names.get(node) or self._own_name(node)
        name, count = wanted, 1
        while name in self.taken:
            count += 1
            name = f"{wanted}_{count}"
        self.taken.add(name)
        note = self.builder.notes.get(node, "")
        comment = f"  /* {note} */" if note else ""
        self.put(f"const {self.options.prefix}_real {name} = {self.text(node)};{comment}")
        self.names[node] = name
        return name

    def _own_name(self, node: Node) -> str:
        """A name from what the value is: a product of two leaves is called after them."""
        if node.op is Op.PRODUCT and all(arg.op in (Op.INPUT, Op.CONSTANT) for arg in node.args):
            parts = [self.text(arg) for arg in node.args]
            if all(re.fullmatch(r"[A-Za-z_][\w.]*", part) for part in parts):
                return "_".join(part.replace(".", "_").lower() for part in parts)
        if node.op is Op.PRODUCT and node.args[0] is node.args[1] and node.args[0] in self.names:
            return re.sub(r"work->|\W", "", self.names[node.args[0]]) + "_squared"
        return self.builder.topics.get(node, "value")

    def value(self, node: Node) -> str:
        """The node as an expression, everything it needs being named first."""
        if node in self.names:
            return self.names[node]
        self.ready(node)
        if self.deserves_name(node):
            return self.name(node)
        return self.text(node)

    # -- text --------------------------------------------------------------------------------------------------------
    def text(self, node: Node) -> str:
        if node in self.names:
            return self.names[node]
        match node.op:
            case Op.CONSTANT:
                named = self._negated(node)
                return self.constants.text(node) if named is None else f"-{self.constants.text(named)}"
            case Op.INPUT:
                return self.names.get(node, node.name)
            case Op.SUM:
                return self._sum(node)
            case Op.PRODUCT:
                return f"{self._factor(node.args[0])} * {self._factor(node.args[1])}"
            case Op.QUOTIENT:
                return f"{self._factor(node.args[0])} / {self._factor(node.args[1], tight=True)}"
            case Op.ROOT:
                return f"{self.options.prefix}_sqrt({self.text(node.args[0])})"
            case Op.SIZE:
                return f"{self.options.prefix}_abs({self.text(node.args[0])})"
            case Op.CHOICE:
                test, above, otherwise = (self._factor(arg, tight=True) for arg in node.args)
                return f"({test} > {literal(0, self.options.real)}) ? {above} : {otherwise}"

    def _negated(self, node: Node) -> Node | None:
        """The constant with a name of its own that this one is the negative of."""
        found = re.fullmatch(r"-\(?(\w+)\)?", node.label)
        return self.builder.constant_named(found[1]) if found and not node.structural else None

    def _sum(self, node: Node) -> str:
        parts = []
        for k, (sign, arg) in enumerate(zip(node.signs, node.args, strict=True)):
            flipped = self._without_minus(arg)
            if flipped is not None:
                sign, text = -sign, flipped
                parts.append(f"{'-' if sign < 0 else '+'} {text}" if k else f"{'-' if sign < 0 else ''}{text}")
                continue
            text = self._factor(arg, tight=arg.op is Op.SUM or arg.op is Op.CHOICE)
            if k == 0 and sign > 0 and arg.op is Op.SUM:
                parts.append(self.text(arg))  # added up from the left anyway
            elif k == 0:
                parts.append(f"-{self._factor(arg, tight=True)}" if sign < 0 else text)
            else:
                parts.append(f"{'-' if sign < 0 else '+'} {text}")
        return " ".join(parts)

    def _without_minus(self, node: Node) -> str | None:
        """The negative of a term that begins with a minus: a constant, or a product with one; None for others."""
        if node in self.names:
            return None
        if node.op is Op.CONSTANT:
            text = self.text(node)
            return text[1:] if text.startswith("-") else None
        if node.op is not Op.PRODUCT:
            return None
        texts = [self._factor(arg) for arg in node.args]
        minus = [text.startswith("(-") and arg.op is Op.CONSTANT for text, arg in zip(texts, node.args, strict=True)]
        if sum(minus) != 1:
            return None
        return " * ".join(text[2:-1] if gone else text for text, gone in zip(texts, minus, strict=True))

    def factor(self, node: Node) -> str:
        """The node as a factor of a product, everything it needs being named first."""
        self.value(node)
        return self._factor(node)

    def _factor(self, node: Node, tight: bool = False) -> str:
        text = self.text(node)
        if node in self.names or node.op in (Op.INPUT, Op.ROOT, Op.SIZE):
            return text
        if node.op is Op.CONSTANT:
            return f"({text})" if text.startswith("-") else text
        if tight or _RANK.get(node.op, 3) < 2 or node.op is Op.QUOTIENT:
            return f"({text})"
        return text


def wrapped(line: str) -> list[str]:
    """A long line broken before an operator or after a comma, continued with a deeper indent."""
    pieces: list[str] = []
    indent = len(line) - len(line.lstrip())
    comment = ""
    if "  /* " in line and len(line) > WIDTH:
        line, comment = line.split("  /* ", 1)
        pieces.append(" " * indent + "/* " + comment)
    while len(line) > WIDTH:
        place = _break_place(line, indent)
        if place <= indent + 8:
            break
        pieces.append(line[:place].rstrip())
        line = " " * (indent + 8) + line[place:].lstrip()
    return [*pieces, line]


def _break_place(line: str, indent: int) -> int:
    """The last place before the width where a line may break; before an adding operator rather than inside a term."""
    for marks in ((" + ", " - ", ", ", " && ", " ? ", " : "), (" * ", " / ")):
        places = [
            line.rfind(mark, indent + 9, WIDTH - 1) + (len(mark) if mark == ", " else 1)
            for mark in marks
            if line.rfind(mark, indent + 9, WIDTH - 1) > 0
        ]
        if places and max(places) > indent + 30:
            return max(places)
    return -1
