"""Where the folders beside the tool's own package lie: the same in a working copy and where pip has installed them."""

from __future__ import annotations

from pathlib import Path

_BESIDE = Path(__file__).resolve().parent.parent
TEMPLATES = _BESIDE / "templates_c"
PAGE_TEMPLATES = Path(__file__).parent / "page" / "templates"
ARMS = _BESIDE / "arms"
