"""Sections as plain text for a terminal, and as Markdown for a pull request."""

from __future__ import annotations

from collections.abc import Iterable

from codegen.compare.report import Code, Grid, Item, Points, Section
from codegen.explain.markdown import table

_WIDEST = 130  # characters


def to_text(title: str, sections: Iterable[Section]) -> str:
    lines = [title]
    for section in sections:
        lines += ["", section.heading.upper(), *_indented(line for item in section.items for line in _text_item(item))]
    return "\n".join(line.rstrip() for line in lines) + "\n"


def _indented(lines: Iterable[str]) -> Iterable[str]:
    return (f"  {line}" for line in lines)


def _text_item(item: Item) -> list[str]:
    match item:
        case str():
            return [item]
        case Points(lines=lines):
            return list(lines)
        case Code(lines=lines):
            return [f"  {line}" for line in lines]
        case Grid():
            return _text_grid(item)


def _text_grid(grid: Grid) -> list[str]:
    """Columns; where they would be too wide for a terminal, one block a row."""
    rows = [grid.head, *grid.rows]
    if max(sum(map(len, row)) + 2 * len(row) for row in rows) > _WIDEST:
        return [line for row in grid.rows for line in _text_record(grid.head, row)]
    widths = [max(len(row[column]) for row in rows) for column in range(len(grid.head))]
    return ["  ".join(_cell(text, widths[k], k in grid.right) for k, text in enumerate(row)) for row in rows]


def _text_record(head: tuple[str, ...], row: tuple[str, ...]) -> list[str]:
    width = max(map(len, head[1:]))
    return [row[0], *(f"  {name.ljust(width)}  {text}" for name, text in zip(head[1:], row[1:], strict=True))]


def _cell(text: str, width: int, right: bool) -> str:
    return text.rjust(width) if right else text.ljust(width)


def to_markdown(title: str, sections: Iterable[Section]) -> str:
    """The difference of the C is folded away: it is long."""
    lines = [f"## {title}", ""]
    for section in sections:
        lines += [f"### {section.heading}", ""]
        for item in section.items:
            lines += [*_markdown_item(item), ""]
    return "\n".join(lines).rstrip("\n") + "\n"


def _markdown_item(item: Item) -> list[str]:
    match item:
        case str():
            return [item]
        case Points(lines=lines):
            return [f"- {line}" for line in lines]
        case Code(lines=lines, language=language):
            block = [f"```{language}", *lines, "```"]
            return ["<details><summary>lines</summary>", "", *block, "", "</details>"] if len(lines) > 30 else block
        case Grid():
            return table(grid_head(item), item.rows, item.right)


def grid_head(grid: Grid) -> tuple[str, ...]:
    return tuple(name or " " for name in grid.head)
