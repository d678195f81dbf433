"""The difference of two C files without what does not matter: comments, empty lines, declarations that say nothing."""

from __future__ import annotations

import re
from collections.abc import Iterator
from difflib import SequenceMatcher

_AROUND = 1  # lines of context


def code_diff(old: dict[str, str], new: dict[str, str], left_out: frozenset[str] = frozenset()) -> tuple[str, ...]:
    """Unified, file by file; lines that differ in comments only count as equal.

    left_out  constants and macros whose declarations do not matter
    """
    lines: list[str] = []
    for name in sorted({*old, *new}):
        before, after = (_code_lines(files.get(name, ""), left_out) for files in (old, new))
        lines += _file_diff(name, before, after)
    return tuple(lines)


def _code_lines(text: str, left_out: frozenset[str]) -> list[str]:
    """Lines that hold code, comments behind it kept."""
    without_blocks = re.sub(r"^[ \t]*/\*.*?\*/[ \t]*$\n?", "", text, flags=re.MULTILINE | re.DOTALL)
    return [line for line in without_blocks.splitlines() if line.strip() and _declared(line) not in left_out]


def _declared(line: str) -> str:
    """The constant or macro that a line declares."""
    found = re.match(r"(?:static const \w+|#define) (\w+)", line)
    return found[1] if found else ""


def _bare(line: str) -> str:
    return re.sub(r"\s*/\*.*?\*/", "", line).rstrip()


def _file_diff(name: str, old: list[str], new: list[str]) -> Iterator[str]:
    matcher = SequenceMatcher(None, [_bare(line) for line in old], [_bare(line) for line in new], autojunk=False)
    groups = [group for group in matcher.get_grouped_opcodes(_AROUND) if any(tag != "equal" for tag, *_ in group)]
    if not groups:
        return
    yield f"--- old/{name}"
    yield f"+++ new/{name}"
    for group in groups:
        yield "@@"
        for tag, old_first, old_last, new_first, new_last in group:
            if tag == "equal":
                yield from (f" {line}" for line in new[new_first:new_last])
            else:
                yield from (f"-{line}" for line in old[old_first:old_last])
                yield from (f"+{line}" for line in new[new_first:new_last])
