"""What the user sees besides data: messages, faults and progress, all on standard error; colour only on a terminal."""

from __future__ import annotations

import os
import sys
import threading
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager

import typer

from codegen.errors import Fault

_PATIENCE = 1.0  # s before a command says what takes so long
_LINES_APART = 5.0  # s between lines of progress where they cannot overwrite each other
_COLOURS = {"error": typer.colors.RED, "warning": typer.colors.YELLOW, "doubt": typer.colors.YELLOW}


def say(text: str) -> None:
    """One message."""
    typer.echo(text, err=True)


def show_data(text: str) -> None:
    """What the command was asked for, on standard output, as it is."""
    typer.echo(text, nl=False)


def show_faults(kind: str, faults: Iterable[Fault]) -> None:
    """Each fault on a line of its own, its hint below."""
    for fault in faults:
        say(f"{_coloured(kind)}: {fault}")


def _coloured(kind: str) -> str:
    if not sys.stderr.isatty() or "NO_COLOR" in os.environ:
        return kind
    return typer.style(kind, fg=_COLOURS[kind], bold=True)


@contextmanager
def working(what: str) -> Iterator[None]:
    """Says what is being done where it takes more than a second."""
    timer = threading.Timer(_PATIENCE, say, [f"{what} ..."])
    timer.daemon = True
    timer.start()
    try:
        yield
    finally:
        timer.cancel()


class Progress:
    """Shows (done, total): a line that is overwritten on a terminal, elsewhere a new line now and then."""

    def __init__(self, what: str) -> None:
        self._what = what
        self._terminal = sys.stderr.isatty()
        self._begin = time.monotonic()
        self._shown = self._begin + _PATIENCE - _LINES_APART
        self._open_line = False

    def __call__(self, done: int, total: int) -> None:
        now = time.monotonic()
        if now - self._begin < _PATIENCE or (not self._terminal and now - self._shown < _LINES_APART):
            return
        self._shown = now
        text = f"{self._what}: {100 * done // max(total, 1)} %"
        typer.echo(f"\r{text}" if self._terminal else text, err=True, nl=not self._terminal)
        self._open_line = self._terminal

    def end(self) -> None:
        """Leaves the overwritten line, so that what follows stands on its own."""
        if self._open_line:
            typer.echo("\r\033[K", err=True, nl=False)
        self._open_line = False
