"""What the C costs on target processors: flash, stack, instructions and cycles of each public function.

Flash is the code and constants of a function and all that it needs, the compiler's arithmetic library included. Stack
is computed from the call graph and also found by painting. Instructions and cycles come from running the function in
an emulator at many poses; the cycles are exact on AVR and elsewhere an estimate, by the weights that the report names.
"""

from __future__ import annotations

import dataclasses
import json
import statistics
import tempfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from build_checks.cost_calls import CostCalls, cost_calls
from build_checks.emulate import Call, machine_for, make_calls
from build_checks.emulate_contract import FUNCTIONS, Interface, TargetInterface, read_interface
from build_checks.emulate_image import Image, compile_objects, link_image
from build_checks.static_callgraph import read_call_graph
from build_checks.targets import TARGETS, Target, target_named, why_not_measured
from codegen.errors import CheckFailedError
from codegen.options import Options

MEASURED_LEVEL = "-O2"  # instructions, cycles and stack; flash is given at both
SMALL_LEVEL = "-Os"


@dataclass(frozen=True, slots=True)
class Spread:
    """Mean and worst over the poses."""

    mean: float
    worst: int


@dataclass(frozen=True, slots=True)
class FunctionCost:
    """One public function alone, with all that it needs.

    flash, flash_small  bytes at -O2 and at -Os
    stack_computed      worst bytes, from the call graph
    stack_painted       most bytes found touched
    """

    function: str
    flash: int
    flash_small: int
    stack_computed: int
    stack_painted: int
    instructions: Spread
    cycles: Spread


@dataclass(frozen=True, slots=True)
class TargetCost:
    """One target.

    flash, flash_small  bytes of all functions together at -O2 and at -Os
    constants, data     bytes at -O2: read-only data, data that can be written
    core_flash          forward, inverse and inverse_all together at -O2
    core_flash_small    the same at -Os
    """

    target: str
    title: str
    cycles_exact: bool
    weights: str
    flash: int
    flash_small: int
    core_flash: int
    core_flash_small: int
    constants: int
    data: int
    functions: tuple[FunctionCost, ...]

    def function(self, name: str) -> FunctionCost:
        """By its name without the prefix."""
        return next(cost for cost in self.functions if cost.function == name)

    @property
    def stack(self) -> int:
        return max(max(cost.stack_computed, cost.stack_painted) for cost in self.functions)

    @property
    def cycles(self) -> int:
        return max(cost.cycles.worst for cost in self.functions)


@dataclass(frozen=True, slots=True)
class CostReport:
    """The outcome of `linkwright cost`.

    not_measured  one line for each target that was asked for and cannot be measured here
    """

    prefix: str
    real: str
    poses: int
    targets: tuple[TargetCost, ...]
    not_measured: tuple[str, ...]

    def to_json(self) -> str:
        """Every figure of the report; the same run gives the same text."""
        return json.dumps(self.content(), indent=2, ensure_ascii=False) + "\n"

    def content(self) -> dict[str, Any]:
        return dataclasses.asdict(self)


def measure_cost(
    files: Mapping[str, str],
    options: Options,
    target_names: Sequence[str],
    poses: Sequence[Sequence[float]],
    *,
    libm: bool = False,
) -> CostReport:
    """Measures the C on the named targets, or on all when none is named.

    poses  joint vectors, SI units: forward kinematics of each gives the pose that inverse kinematics is measured at
    libm   link the toolchain's mathematics, which the C is known to call
    """
    interface = read_interface(files, options.prefix)
    targets = [target_named(name) for name in target_names] or list(TARGETS)
    missing = {target.name: _why_not(target, interface) for target in targets}
    here = [target for target in targets if missing[target.name] is None]
    calls = cost_calls(files, interface, poses, libm) if here else None
    costs = []
    for target in here:
        assert calls is not None
        try:
            costs.append(_measure(files, calls, target, libm))
        except CheckFailedError as error:  # too much stack, or no end: what does not fit one target may fit the others
            where = error.faults[0].where.removeprefix(f"{target.title}: ")
            missing[target.name] = f"{target.title}: not measured: {where} {error.faults[0].what}"
    lines = tuple(line for line in missing.values() if line)
    return CostReport(options.prefix, interface.real, len(poses), tuple(costs), lines)


def _why_not(target: Target, interface: Interface) -> str | None:
    """One line when the target cannot be measured here, or has no such number type."""
    if interface.real == "double" and target.double_bytes < 8:
        return f"{target.title}: not measured: its compiler's double is a float; measure the float code there"
    return why_not_measured(target)


def _measure(files: Mapping[str, str], calls: CostCalls, target: Target, libm: bool) -> TargetCost:
    with tempfile.TemporaryDirectory() as folder:
        fast = _Build(files, calls.interface, target, Path(folder) / "fast", MEASURED_LEVEL, libm)
        small = _Build(files, calls.interface, target, Path(folder) / "small", SMALL_LEVEL, libm)
        whole = fast.link(fast.names, "whole")
        functions = _function_costs(fast, small, whole, calls.on(TargetInterface(calls.interface, target)))
        core = [name for name in fast.names if name in ("forward", "inverse", "inverse_all")]
        return TargetCost(
            target.name,
            target.title,
            target.cycles_exact,
            target.weights.source if target.weights else "counted by the simulator",
            whole.flash,
            small.link(small.names, "whole").flash,
            fast.link(core, "core").flash,
            small.link(core, "core").flash,
            whole.constants,
            whole.data,
            functions,
        )


class _Build:
    """The C compiled for one target at one level, ready to be linked for any set of public functions."""

    def __init__(
        self, files: Mapping[str, str], interface: Interface, target: Target, folder: Path, level: str, libm: bool
    ) -> None:
        self._prefix, self._libm = interface.prefix, libm
        self._objects = compile_objects(target, files, folder, optimise=level, libm=libm)
        header = files[f"{interface.prefix}_kin.h"]
        self.names = [name for name in FUNCTIONS if f"{interface.prefix}_{name}(" in header]

    def link(self, names: Sequence[str], file: str) -> Image:
        return link_image(self._objects, [f"{self._prefix}_{name}" for name in names], file, libm=self._libm)


def _function_costs(
    fast: _Build, small: _Build, whole: Image, calls: Mapping[str, list[Call]]
) -> tuple[FunctionCost, ...]:
    machine = machine_for(whole)
    graph = read_call_graph(whole)
    found = []
    for name in fast.names:
        results = list(make_calls(machine, calls[name], count=True))
        symbol = results[0].function
        found.append(
            FunctionCost(
                name,
                fast.link([name], name).flash,
                small.link([name], name).flash,
                graph.worst_stack(symbol),
                max(result.stack for result in results),
                _spread([result.instructions for result in results]),
                _spread([result.cycles for result in results]),
            )
        )
    return tuple(found)


def _spread(values: Sequence[int]) -> Spread:
    return Spread(round(statistics.fmean(values), 1), max(values))
