"""Small pieces of Markdown: tables and blocks of formulas."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from codegen.explain.formula import Line, printed


def table(head: Sequence[str], rows: Iterable[Sequence[str]], right: Sequence[int] = ()) -> list[str]:
    """Columns in `right` stand flush right. Cells are padded, so that the text reads well unrendered too."""
    cells = [list(map(_cell, head)), *(list(map(_cell, row)) for row in rows)]
    widths = [max(3, *(len(row[column]) for row in cells)) for column in range(len(head))]
    rule = [("-" * (w - 1) + ":") if column in right else "-" * w for column, w in enumerate(widths)]
    return [_row(line, widths, right) for line in (cells[0], rule, *cells[1:])]


def _cell(text: str) -> str:
    return text.replace("|", "\\|").replace("\n", " ")


def _row(cells: Sequence[str], widths: Sequence[int], right: Sequence[int]) -> str:
    padded = (
        text.rjust(width) if column in right else text.ljust(width)
        for column, (text, width) in enumerate(zip(cells, widths, strict=True))
    )
    return f"| {' | '.join(padded)} |"


def block(lines: Iterable[Line]) -> list[str]:
    """A block of formulas; nothing where there are none."""
    shown = printed(lines)
    return ["```text", *shown, "```", ""] if shown else []
