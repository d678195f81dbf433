"""The evidence file: everything that was found out about one generated arm, as JSON."""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from codegen.cost_static import OperationCount, forward_count, inverse_count, jacobian_count
from codegen.elementary.table import figures_for
from codegen.emit.files import Source, command_line
from codegen.emit.numbers import rounded
from codegen.evidence.deviations import DeviationUse
from codegen.evidence.loops import loops_of
from codegen.evidence.versions import dependency_versions
from codegen.exact import Real
from codegen.golden import golden_vectors
from codegen.inverse.tasks import derive
from codegen.model import Arm
from codegen.options import Mathematics, Options

GOLDEN_SIZE = 16


@dataclass(frozen=True, slots=True)
class Measured:
    """What only compilers and checkers can tell.

    tools         their names and versions
    agreement     the report of `agree`
    stack         of each target, the worst bytes of each public function
    not_measured  one line for each target whose compiler is not here
    deviations    from MISRA C:2012
    findings      of its checker that no deviation covers
    """

    tools: Mapping[str, str]
    agreement: Mapping[str, Any]
    stack: Mapping[str, Mapping[str, int]]
    not_measured: Sequence[str]
    deviations: Sequence[DeviationUse]
    findings: Sequence[str] = field(default_factory=tuple)


@dataclass(frozen=True, slots=True)
class Evidence:
    """One generated arm and what was measured of it."""

    arm: Arm
    options: Options
    source: Source
    files: Mapping[str, str]
    measured: Measured


def evidence_json(evidence: Evidence) -> str:
    """The file's text; the same arm, options and tools give the same bytes."""
    arm, options, measured = evidence.arm, evidence.options, evidence.measured
    content = {
        "arm": {"name": arm.name, "task": arm.task.key, "joints": [row.name for row in arm.joints]},
        "arm_file": {"name": evidence.source.name, "sha256": evidence.source.digest},
        "command": command_line(evidence.source, options),
        "versions": {**dependency_versions(), **dict(sorted(measured.tools.items()))},
        "files": [{"name": name, "sha256": _digest(text)} for name, text in sorted(evidence.files.items())],
        "mathematics": _mathematics(options),
        "operations": _operations(arm, options),
        "loops": [dataclasses.asdict(loop) for loop in loops_of(evidence.files, options.prefix)],
        "stack": {"bytes": measured.stack, "not_measured": list(measured.not_measured)},
        "misra": {
            "deviations": [dataclasses.asdict(row) for row in measured.deviations],
            "findings": list(measured.findings),
        },
        "agreement": measured.agreement,
        "golden_vectors": _golden(arm, options),
    }
    return json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def _digest(text: str) -> str:
    return hashlib.sha256(text.encode("utf-8")).hexdigest()


def _mathematics(options: Options) -> dict[str, Any]:
    """Worst errors of the C's own functions, in units in the last place, with the arguments that reach them."""
    if options.mathematics is not Mathematics.OWN:
        return {"source": "the compiler's library"}
    figures = figures_for(options)
    if figures is None:
        return {"source": "own", "worst_errors_ulp": "not measured"}
    names = ("sine", "cosine", "sine_cosine", "arc", "atan2")
    return {"source": "own", "worst_errors_ulp": {name: dataclasses.asdict(getattr(figures, name)) for name in names}}


def _operations(arm: Arm, options: Options) -> dict[str, Any]:
    """Counted on the formulas; of an inverse that tracks from its seed there is no count."""
    derivation = derive(arm)
    found: dict[str, OperationCount] = {
        "forward": forward_count(arm, options),
        "jacobian": jacobian_count(arm, options, derivation),
    }
    if derivation is not None:
        inverse = inverse_count(derivation, options)
        found |= {"inverse, one branch": inverse.one_branch, "inverse_all": inverse.all_branches}
    return {name: dataclasses.asdict(count) for name, count in found.items()}


def _golden(arm: Arm, options: Options) -> list[dict[str, Any]]:
    """Joint values exact in binary, and the pose that they give, rounded to the number type of the C."""

    def numbers(values: Sequence[Real]) -> list[float]:
        return [rounded(value, options.real) for value in values]

    return [
        {
            "joints": [float(q) for q in vector.joints],
            "rotation": [numbers(vector.rotation[3 * i : 3 * i + 3]) for i in range(3)],
            "position": numbers(vector.position),
        }
        for vector in golden_vectors(arm, GOLDEN_SIZE)
    ]
