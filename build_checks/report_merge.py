"""Reports of the parts of one agreement run, written on several machines and joined again.

A part's file is its report with two keys more: which part it is, and the digest of the C that it checked. Only the
parts of one run on the same C can be joined, each once and all of them.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from build_checks.report import AgreeReport, Check, CheckResult, Failure, Run, Worst, join_all
from codegen.errors import CallError, Fault

Shard = tuple[int, int]  # (i, n): the i-th of n parts, from 1


@dataclass(frozen=True, slots=True)
class Part:
    """One report: where it came from, which part of the run it is, and the digest of the C."""

    path: str
    report: AgreeReport
    shard: Shard
    digest: str


def digest_of(files: Mapping[str, str]) -> str:
    """SHA-256 of the names and texts of the C."""
    content = "".join(f"{name}\0{files[name]}\0" for name in sorted(files))
    return hashlib.sha256(content.encode("utf-8")).hexdigest()


def part_text(part: Part) -> str:
    """The report as JSON, with what joining needs to know."""
    content = json.loads(part.report.to_json())
    content["run"] |= {"shard": list(part.shard), "c_digest": part.digest}
    return json.dumps(content, indent=2, ensure_ascii=False) + "\n"


def read_part(path: str, text: str) -> Part:
    """CallError where the text is no report."""
    try:
        content = json.loads(text)
        run = dict(content["run"])
        part, parts = run.pop("shard")
        digest = str(run.pop("c_digest"))
        results = tuple(_result(row) for row in content["checks"])
        return Part(path, AgreeReport(Run(**run), results), (int(part), int(parts)), digest)
    except (ValueError, KeyError, TypeError, AttributeError):
        hint = "give files that agree wrote with --report"
        raise CallError(Fault(path, "is no report of an agreement run", hint)) from None


def joined(parts: Sequence[Part]) -> AgreeReport:
    """The report of the whole run. CallError where the parts are not those of one run, or not all of them."""
    faults = [*_strangers(parts), *_missing_or_repeated(parts)] if parts else [Fault("--merge", "no report to join")]
    if faults:
        raise CallError(*faults)
    in_order = sorted(parts, key=lambda part: part.shard)
    return AgreeReport(parts[0].report.run, join_all(result for part in in_order for result in part.report.results))


def _strangers(parts: Sequence[Part]) -> list[Fault]:
    """Reports of another run than the first one's."""
    first = parts[0]
    hint = "join the parts of one run: same arm file, options, samples and seed, same version"
    return [
        Fault(part.path, f"is not of the run that {first.path} is of", hint)
        for part in parts[1:]
        if (part.report.run, part.digest, part.shard[1]) != (first.report.run, first.digest, first.shard[1])
    ]


def _missing_or_repeated(parts: Sequence[Part]) -> list[Fault]:
    count = parts[0].shard[1]
    found = [part.shard[0] for part in parts if part.shard[1] == count]
    missing = [str(number) for number in range(1, count + 1) if number not in found]
    repeated = [str(number) for number in sorted(set(found)) if found.count(number) > 1]
    faults = []
    if missing:
        faults.append(Fault("--merge", f"of {count} parts, these are missing: {', '.join(missing)}", "give them too"))
    if repeated:
        faults.append(Fault("--merge", f"given more than once: part {', '.join(repeated)}", "give each part once"))
    return faults


def _result(row: Mapping[str, Any]) -> CheckResult:
    failure = row["failure"]
    return CheckResult(
        Check[str(row["check"]).upper()],
        int(row["cases"]),
        int(row["failed"]),
        int(row["undecided"]),
        _worst(row["position"]),
        _worst(row["angle"]),
        Failure(str(failure["what"]), dict(failure["details"])) if failure else None,
        int(row["lacking"]),
    )


def _worst(row: Mapping[str, Any] | None) -> Worst | None:
    """Numbers that JSON cannot hold stand as texts."""
    return Worst(float(row["error"]), tuple(float(value) for value in row["joints"])) if row else None
