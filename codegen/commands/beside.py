"""What `generate` can write beside the C: the self-test for the board, and the evidence."""

from __future__ import annotations

from typing import Annotated

import typer

from codegen.commands.arguments import Wanted
from codegen.commands.console import Progress, working
from codegen.errors import CallError, Fault

MOST_VECTORS = 1000

SelfTest = Annotated[
    bool,
    typer.Option("--self-test", help="Also PREFIX_kin_selftest.c and .h: golden vectors for the board's power-up."),
]
SelfTestSize = Annotated[
    int | None,
    typer.Option("--self-test-size", metavar="N", help="Golden vectors in the self-test.", show_default="8"),
]
EvidenceWanted = Annotated[
    bool,
    typer.Option(
        "--evidence",
        help="Also what a certification file needs: PREFIX_kin.evidence.json and PREFIX_kin.misra.md.",
    ),
]


def check_size(self_test: bool, size: int | None) -> None:
    """Raises CallError for a size that makes no sense."""
    if size is None:
        return
    if not self_test:
        raise CallError(Fault("--self-test-size", "says nothing without --self-test", "give both, or leave it out"))
    if not 1 <= size <= MOST_VECTORS:
        raise CallError(Fault("--self-test-size", f"{size} vectors", f"1 to {MOST_VECTORS} are accepted"))


def self_test_of(what: Wanted, files: dict[str, str], size: int | None) -> dict[str, str]:
    """The two files of the self-test."""
    from codegen.selftest import DEFAULT_SIZE, is_numeric, selftest_files

    numeric = is_numeric(files, what.options.prefix)
    with working("choosing golden vectors"):
        return selftest_files(what.file.arm, what.options, what.source, size or DEFAULT_SIZE, numeric=numeric)


def evidence_of(what: Wanted, files: dict[str, str]) -> dict[str, str]:
    """The two files of the evidence. CheckFailedError when the C does not agree with the link table."""
    from codegen.commands.evidence import evidence_files

    progress = Progress("checking")
    try:
        return evidence_files(what.file.arm, what.options, what.source, files, progress)
    finally:
        progress.end()
