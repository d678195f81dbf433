"""The MISRA C:2012 deviation record of one generated file, as Markdown."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from codegen import VERSION


@dataclass(frozen=True, slots=True)
class DeviationUse:
    """A guideline that the C departs from on purpose: its category, the reason, and at how many places."""

    rule: str
    category: str
    places: int
    reason: str


def deviation_file(
    name: str, command: str, checker: str, deviations: Sequence[DeviationUse], findings: Sequence[str]
) -> str:
    """name: of the C file; checker: program and version; findings: what no deviation covers."""
    return "\n".join(
        [
            f"# MISRA C:2012 deviations of {name}",
            "",
            f"`{command}`, linkwright {VERSION}. Checked with {checker}.",
            "",
            "No mandatory guideline is departed from. A guideline that the checker covers and that has no row here is met;",
            "what it does not cover is listed by the checker's own documentation.",
            "",
            "| guideline | category | places | reason |",
            "| --- | --- | ---: | --- |",
            *(f"| Rule {row.rule} | {row.category} | {row.places} | {row.reason} |" for row in deviations),
            "",
            *_finding_lines(findings),
            "",
        ]
    )


def _finding_lines(findings: Sequence[str]) -> list[str]:
    if not findings:
        return ["Findings beyond these deviations: none."]
    return ["Findings beyond these deviations:", "", *(f"- {finding}" for finding in findings)]
