"""From a path to the parsed TOML of an arm file, whatever stands at that path.

Size, line length and encoding are looked at before the parser sees the text, so that its time stays bounded; numbers
with a point or an exponent come out as `Decimal`, just as they were typed.
"""

from __future__ import annotations

import difflib
import re
import tomllib
from decimal import Decimal, InvalidOperation
from pathlib import Path

from codegen.armfile_keys import LONGEST_LINE, MOST_BYTES
from codegen.errors import ArmFileError, Fault

_AT = re.compile(r" \(at (?:line (\d+), column (\d+)|end of document)\)$")
_MENDS = (  # what the parser says, what the user may do about it
    ("Invalid value", "a value is a number (0.5, not .5 or pi/2), text in quotes, or a list in brackets"),
    ("Unclosed array", "a list is written [1, 2, 3]; no number begins with a spare zero"),
    ("Expected newline", "write one key = value on a line, with a decimal point and lists in brackets"),
    ("Expected '='", "write key = value"),
    ("Cannot overwrite", "a key stands once in a table; each joint has its own [[joint]]"),
    ("Cannot declare", "a table stands once; each joint begins with [[joint]], in double brackets"),
)


def read_bytes(path: Path) -> bytes:
    """The bytes of the file; ArmFileError when there is no such file or it cannot be an arm file."""
    try:
        with path.open("rb") as stream:
            content = stream.read(MOST_BYTES + 1)
    except FileNotFoundError:
        raise _refusal(path, "no such file", _similar_file(path)) from None
    except IsADirectoryError:
        raise _refusal(path, "this is a directory, not an arm file", "name a .toml file") from None
    except PermissionError:
        raise _refusal(path, "no permission to read this file", "check its access rights") from None
    except (OSError, ValueError) as error:
        raise _refusal(path, f"cannot be read: {getattr(error, 'strerror', None) or error}") from None
    if len(content) > MOST_BYTES:
        raise _refusal(path, f"larger than {MOST_BYTES} bytes", "an arm file has a few thousand; is this one?")
    return content


def parse_toml(path: Path, content: bytes) -> dict[str, object]:
    """The tables of the file; ArmFileError with line and column when the bytes are no TOML."""
    text = _decoded(path, content)
    _refuse_long_lines(path, text)
    try:
        return tomllib.loads(text, parse_float=_decimal)
    except tomllib.TOMLDecodeError as error:
        raise _syntax_error(path, text, str(error)) from None
    except RecursionError:
        raise _refusal(
            path, "lists or tables nested too deeply", "no key of an arm file needs more than one list"
        ) from None
    except ValueError:  # Python refuses integers of thousands of digits
        raise _refusal(path, "an integer has thousands of digits", "write a number of ordinary size") from None


def _refusal(where: Path | str, what: str, hint: str = "") -> ArmFileError:
    return ArmFileError(Fault(str(where), what, hint))


def _similar_file(path: Path) -> str:
    """A hint naming a neighbour with a similar name, if there is one."""
    try:
        names = sorted(entry.name for entry in path.parent.iterdir() if entry.suffix == ".toml")
    except (OSError, ValueError):
        return ""
    close = difflib.get_close_matches(path.name, names, n=1)
    return f'did you mean "{path.parent / close[0]}"?' if close else ""


def _decoded(path: Path, content: bytes) -> str:
    try:
        return content.decode("utf-8-sig")  # some editors put a byte order mark in front
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        found = f"byte 0x{content[error.start]:02x} is not UTF-8 text"
        raise _refusal(f"{path}:{line}", found, "save the file with the encoding UTF-8") from None


def _refuse_long_lines(path: Path, text: str) -> None:
    for number, line in enumerate(text.split("\n"), start=1):
        if len(line) > LONGEST_LINE and not line.lstrip().startswith("#"):
            raise _refusal(f"{path}:{number}", f"a line of {len(line)} characters; at most {LONGEST_LINE} are accepted")


def _decimal(text: str) -> Decimal:
    """The number as typed; an exponent beyond even Decimal counts as infinite, and is refused as such."""
    try:
        return Decimal(text)
    except InvalidOperation:
        return Decimal("Infinity")


def _syntax_error(path: Path, text: str, message: str) -> ArmFileError:
    line, column = _position(text, message)
    said = _AT.sub("", message)
    lines = text.split("\n")
    typed = lines[line - 1].strip() if line <= len(lines) else ""
    mend = next((mend for start, mend in _MENDS if said.startswith(start)), "")
    shown = f"the line reads: {_printable(typed)[:100]}" if typed else ""
    hint = "; ".join(part for part in (mend, shown) if part)
    return _refusal(f"{path}:{line}:{column}", f"not TOML: {_printable(said)}", hint)


def _position(text: str, message: str) -> tuple[int, int]:
    """Line and column of a parser's message, counted from 1."""
    found = _AT.search(message)
    if found and found[1]:
        return int(found[1]), int(found[2])
    lines = text.rstrip().split("\n")
    return len(lines), len(lines[-1]) + 1


def _printable(text: str) -> str:
    return "".join(sign if sign.isprintable() else repr(sign)[1:-1] for sign in text)
