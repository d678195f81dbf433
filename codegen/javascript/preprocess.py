"""The C preprocessor's part that generated C uses: conditions, macros without arguments, includes that are left out.

Of the compiler nothing is defined, so that the portable way of each choice is taken.
"""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator

_KNOWN = {"DBL_MANT_DIG": "53", "DBL_MAX": "1.7976931348623157e+308"}
_COMMENT = re.compile(r"/\*.*?\*/", re.DOTALL)
_DIRECTIVE = re.compile(r"\s*#\s*(\w+)\s*(.*)")
_CONDITIONS = ("if", "ifdef", "ifndef", "elif", "else", "endif")


def preprocessed(header: str, source: str) -> str:
    """Header and source as one text without comments and directives. Raises ValueError on a directive it cannot read."""
    macros = dict(_KNOWN)
    lines = (_COMMENT.sub(" ", header) + "\n" + _COMMENT.sub(" ", source)).splitlines()
    return "\n".join(_kept(lines, macros)) + "\n"


def _kept(lines: list[str], macros: dict[str, str]) -> Iterator[str]:
    taken: list[bool] = []  # of each condition that is open: whether this part of it is kept
    done: list[bool] = []  # and whether a part of it was
    for line in lines:
        directive = _DIRECTIVE.match(line)
        if directive is None:
            if all(taken) and line.strip():
                yield _expanded(line, macros)
            continue
        word, rest = directive[1], directive[2].strip()
        if word in _CONDITIONS:
            _branch(word, rest, macros, taken, done)
        elif all(taken):
            _obey(word, rest, macros)


def _branch(word: str, rest: str, macros: dict[str, str], taken: list[bool], done: list[bool]) -> None:
    if word == "endif":
        taken.pop()
        done.pop()
        return
    if word in ("elif", "else"):
        taken[-1] = not done[-1] and all(taken[:-1]) and (word == "else" or _holds(rest, macros))
        done[-1] = done[-1] or taken[-1]
        return
    defined = (rest in macros) == (word == "ifdef")
    holds = (all(taken) and _holds(rest, macros)) if word == "if" else defined
    taken.append(holds)
    done.append(holds)


def _obey(word: str, rest: str, macros: dict[str, str]) -> None:
    if word == "define":
        name, _, value = rest.partition(" ")
        if "(" in name:
            raise ValueError(f"a macro with arguments: {rest}")
        macros[name] = value.strip()
    elif word not in ("include", "pragma"):
        raise ValueError(f"#{word} {rest}")


def _holds(condition: str, macros: dict[str, str]) -> bool:
    """An integer expression of defined(NAME), macros and numbers; an unknown name is 0 (ISO/IEC 9899:2011, 6.10.1 p4)."""
    text = re.sub(r"defined\s*\(\s*(\w+)\s*\)|defined\s+(\w+)", lambda m: str(int((m[1] or m[2]) in macros)), condition)
    text = re.sub(r"\b[A-Za-z_]\w*\b", "0", _expanded(text, macros))
    text = re.sub(r"!(?!=)", " not ", text.replace("&&", " and ").replace("||", " or "))
    return bool(_number(ast.parse(text.strip(), mode="eval").body))


def _number(node: ast.expr) -> int:
    match node:
        case ast.Constant(value=int(value)):
            return value
        case ast.BoolOp(op=ast.And(), values=values):
            return int(all(_number(value) for value in values))
        case ast.BoolOp(op=ast.Or(), values=values):
            return int(any(_number(value) for value in values))
        case ast.UnaryOp(op=ast.Not(), operand=operand):
            return int(not _number(operand))
        case ast.BinOp(left=left, op=ast.BitAnd(), right=right):
            return _number(left) & _number(right)
        case ast.Compare(left=left, ops=[op], comparators=[right]):
            return int(_compared(_number(left), op, _number(right)))
    raise ValueError(f"a condition of the preprocessor: {ast.unparse(node)}")


def _compared(left: int, op: ast.cmpop, right: int) -> bool:
    match op:
        case ast.Eq():
            return left == right
        case ast.NotEq():
            return left != right
        case ast.GtE():
            return left >= right
        case ast.Lt():
            return left < right
    raise ValueError(f"a comparison of the preprocessor: {type(op).__name__}")


def _expanded(line: str, macros: dict[str, str]) -> str:
    return re.sub(r"\b[A-Za-z_]\w*\b", lambda m: macros.get(m[0], m[0]), line)
