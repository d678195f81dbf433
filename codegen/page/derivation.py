"""Markdown of the derivation as HTML. The formulas stand as text, so that they need nothing but a fixed-width font."""

from __future__ import annotations

import re
from collections.abc import Sequence
from functools import cache

from markdown_it import MarkdownIt
from markdown_it.renderer import RendererHTML
from markdown_it.token import Token
from markdown_it.utils import EnvType, OptionsDict

_SCROLLING = {"table": "Table", "fence": "Formulas"}  # may be wider than a phone: they scroll by themselves


def html_of(lines: Sequence[str]) -> str:
    """The lines' HTML. Their headings, ### in the Markdown, become h4 with an id each."""
    parser = _parser()
    tokens = parser.parse("\n".join(lines))
    for token, following in zip(tokens, [*tokens[1:], None], strict=True):
        if token.type in ("heading_open", "heading_close"):
            token.tag = f"h{int(token.tag[1]) + 1}"
        if token.type == "heading_open" and following is not None:
            token.attrSet("id", slug(following.content))
    return str(parser.renderer.render(tokens, parser.options, {}))


def slug(heading: str) -> str:
    """A heading as an address within the page."""
    return re.sub(r"[^a-z0-9]+", "-", heading.lower()).strip("-")


@cache
def _parser() -> MarkdownIt:
    parser = MarkdownIt("commonmark", {"html": False}).enable("table")
    parser.add_render_rule("table_open", _table_open)
    parser.add_render_rule("table_close", _table_close)
    parser.add_render_rule("fence", _fence)
    return parser


def _opened(kind: str) -> str:
    return f'<div class="scroll" tabindex="0" role="region" aria-label="{_SCROLLING[kind]}">'


def _table_open(_: RendererHTML, tokens: Sequence[Token], index: int, options: OptionsDict, env: EnvType) -> str:
    return f"{_opened('table')}<table>\n"


def _table_close(_: RendererHTML, tokens: Sequence[Token], index: int, options: OptionsDict, env: EnvType) -> str:
    return "</table></div>\n"


def _fence(self: RendererHTML, tokens: Sequence[Token], index: int, options: OptionsDict, env: EnvType) -> str:
    return f"{_opened('fence')}{self.code_block(tokens, index, options, env).rstrip()}</div>\n"
