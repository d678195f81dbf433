"""`linkwright agree`: the generated C, compiled on this machine, against a float64 reference of the link table.

The work is a list of units, each with its own random numbers drawn from the run's seed and the unit's place in the
list; so the report is the same on any number of processors, and a list can be split over machines. A unit judges one
kind of poses by every check that applies to them; counts and worst errors of all units join to one report.
"""

from __future__ import annotations

import multiprocessing
import os
import zlib
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from dataclasses import dataclass, replace

import numpy as np

from build_checks.agree_atan2 import check_atan2
from build_checks.agree_bench import Bench
from build_checks.agree_budget import budget_of
from build_checks.agree_edges import check_degenerate, check_right_angles, check_unreachable, check_unstated
from build_checks.agree_huge import check_huge
from build_checks.agree_inputs import check_inputs
from build_checks.agree_limits import check_at_limits, check_beyond_limits
from build_checks.agree_nearest import check_ties
from build_checks.agree_random import check_far_turns, check_motion, check_random
from build_checks.agree_search import check_search
from build_checks.agree_steady import check_steady
from build_checks.compile import Kinematics, Library, compiled
from build_checks.reference import Reference
from build_checks.report import AgreeReport, Check, CheckResult, Failure, Run, join_all
from codegen.errors import CheckFailedError, Fault
from codegen.model import Arm
from codegen.options import Options

DEFAULT_SAMPLES = 100_000
_PART = 4096  # samples of one unit
_SEARCHED = 4  # poses searched in one unit
_NUMERIC_SHARE = 32
_FLOOR = 0.99  # share of solutions that a numeric inverse must find, counted over this many cases at least
_FLOOR_CASES = 100
_WORTH_PROCESSES = 20_000  # samples; below, starting processes costs more than it saves
Progress = Callable[[int, int], None]
Work = Callable[[Bench, np.random.Generator, int], None]


@dataclass(frozen=True, slots=True)
class Settings:
    """How much to check.

    samples    random joint vectors
    seed       repeats the run
    thorough   poses whose solutions are also searched for by brute force; 0: none
    processes  None: one per processor
    shard      (i, n) runs the i-th of n parts of the work, i from 1; `report_merge` joins their reports
    """

    samples: int = DEFAULT_SAMPLES
    seed: int = 1
    thorough: int = 0
    processes: int | None = None
    shard: tuple[int, int] = (1, 1)


@dataclass(frozen=True, slots=True)
class Unit:
    """One piece of work: what to check, how many cases, and what tells its random numbers from all others."""

    work: str
    index: int
    size: int


_WORK: dict[str, Work] = {
    "inputs": check_inputs,
    "atan2": check_atan2,
    "huge": check_huge,
    "right angles": check_right_angles,
    "degenerate": check_degenerate,
    "unreachable": check_unreachable,
    "unstated": check_unstated,
    "at limits": check_at_limits,
    "beyond limits": check_beyond_limits,
    "far turns": check_far_turns,
    "ties": check_ties,
    "steady": check_steady,
    "motion": check_motion,
    "random": check_random,
    "search": check_search,
}
_FULL_SIZES = {
    "inputs": 64,
    "atan2": 200_000,
    "huge": 1024,
    "right angles": 4096,
    "degenerate": 2048,
    "unreachable": 2048,
    "unstated": 1024,
    "at limits": 4096,
    "beyond limits": 4096,
    "far turns": 4096,
    "ties": 4096,
    "steady": 4096,
}


def units(settings: Settings, numeric: bool = False) -> list[Unit]:
    """All the work of a run. Few samples also mean fewer cases of the other kinds, but never none.

    A numeric inverse takes a thousand times as long as a closed form, so fewer of its poses are solved.
    """
    share = min(1.0, settings.samples / 20_000) / (_NUMERIC_SHARE if numeric else 1)
    special = [Unit(work, 0, max(32, round(share * size))) for work, size in _FULL_SIZES.items()]
    solved = max(32, settings.samples // _NUMERIC_SHARE) if numeric else settings.samples
    return [
        *special,
        *_split("motion", settings.samples, _PART),
        *_split("random", solved, _PART // _NUMERIC_SHARE if numeric else _PART),
        *_split("search", settings.thorough, _SEARCHED),
    ]


def _split(work: str, total: int, most: int) -> list[Unit]:
    return [Unit(work, start // most, min(most, total - start)) for start in range(0, total, most)]


def agree(
    arm: Arm,
    files: dict[str, str],
    options: Options,
    settings: Settings | None = None,
    progress: Progress | None = None,
) -> AgreeReport:
    """Compiles the generated `files` of `arm` and checks them. Raises when there is no compiler or the C does not
    compile."""
    return weighed(find(arm, files, options, settings or Settings(), progress))


@dataclass(frozen=True, slots=True)
class Findings:
    """What the checks of one shard counted. Those of all shards of a run, together in any order, are the whole run's."""

    run: Run
    interface: CheckResult
    results: tuple[CheckResult, ...]

    def together(self, other: Findings) -> Findings:
        """Every shard looks at the interface for itself; it is one fact of the C and counted once."""
        interface = self.interface if self.interface.failed else other.interface
        return Findings(self.run, interface, join_all([*self.results, *other.results]))


def find(
    arm: Arm, files: dict[str, str], options: Options, settings: Settings, progress: Progress | None = None
) -> Findings:
    """What `agree` does, before the whole is judged."""
    with compiled(files, options) as library:
        c = Kinematics(library)
        interface = _interface(arm, c)
        results: tuple[CheckResult, ...] = ()
        if not interface.failed:
            work = _shard(units(settings, c.numeric), settings.shard)
            results = join_all(_run(arm, library, settings, work, progress or _silent))
        return Findings(_describe(arm, options, settings, c), interface, results)


def weighed(found: Findings) -> AgreeReport:
    """The report of all that was found. C with another interface than the contract's is not judged further."""
    results = () if found.interface.failed else found.results
    return AgreeReport(found.run, tuple(map(_floored, join_all([found.interface, *results]))))


def _floored(result: CheckResult) -> CheckResult:
    """A numeric inverse may lack solutions, but not many."""
    if result.cases < _FLOOR_CASES or result.lacking <= (1 - _FLOOR) * result.cases:
        return result
    found = result.cases - result.lacking
    failure = Failure(f"finds {found} of {result.cases} solutions, fewer than {_FLOOR:.0%}", {})
    return replace(result, failed=result.lacking, failure=failure)


def _silent(done: int, total: int) -> None:
    """Tells nobody."""


def _interface(arm: Arm, c: Kinematics) -> CheckResult:
    faults = list(c.faults)
    if c.joints != len(arm.joints):
        faults.append(f"{c.joints} joints, not {len(arm.joints)}")
    if c.branches < 1:
        faults.append(f"{c.branches} branches")
    failure = Failure("; ".join(faults), {}) if faults else None
    return CheckResult(Check.INTERFACE, cases=1, failed=int(bool(faults)), failure=failure)


def _describe(arm: Arm, options: Options, settings: Settings, c: Kinematics) -> Run:
    budget = budget_of(options, len(arm.joints))
    return Run(
        arm=arm.name,
        task=arm.task.key,
        real=options.real.c_name,
        mathematics=options.mathematics.value,
        prefix=options.prefix,
        joints=c.joints,
        branches=c.branches,
        numeric=c.numeric,
        seed=settings.seed,
        samples=settings.samples,
        thorough=settings.thorough,
        reach=Reference(arm).reach,
        position_budget=budget.share,
        angle_budget=budget.angle,
        length_unit=arm.length_unit,
        angle_unit=arm.angle_unit,
    )


def _shard(work: list[Unit], shard: tuple[int, int]) -> list[Unit]:
    part, parts = shard
    return work[part - 1 :: parts]


def _run(arm: Arm, library: Library, settings: Settings, work: list[Unit], progress: Progress) -> Iterator[CheckResult]:
    progress(0, len(work))
    with _mapper(arm, library, settings) as mapped:
        for done, results in enumerate(mapped([(settings.seed, unit) for unit in work]), start=1):
            progress(done, len(work))
            yield from results


Mapped = Callable[[list[tuple[int, Unit]]], Iterable[list[CheckResult]]]


@contextmanager
def _mapper(arm: Arm, library: Library, settings: Settings) -> Iterator[Mapped]:
    """Runs units in order, on as many processes as are worth starting."""
    processes = settings.processes or _processors()
    if processes == 1 or (settings.samples < _WORTH_PROCESSES and not settings.thorough):
        bench = Bench(arm, library)  # not the process's own: other threads of it may check other arms
        yield lambda work: (_judged(bench, *job) for job in work)
        return
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(processes, context, _open_bench, (arm, library)) as pool:
        try:
            yield lambda work: pool.map(_run_unit, work)
        except BrokenProcessPool:
            raise CheckFailedError(Fault("compiled C", "ended the process that called it", "a wild pointer?")) from None
        finally:
            pool.shutdown(cancel_futures=True)


def _processors() -> int:
    """Those that this process may use, where the system tells."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


_bench: list[Bench] = []  # one per process: the reference and the library are opened once


def _open_bench(arm: Arm, library: Library) -> None:
    _bench[:] = [Bench(arm, library)]


def _run_unit(job: tuple[int, Unit]) -> list[CheckResult]:
    return _judged(_bench[0], *job)


def _judged(opened: Bench, seed: int, unit: Unit) -> list[CheckResult]:
    """One unit, judged with a fresh tally."""
    bench = opened.fresh()
    place = zlib.crc32(unit.work.encode())
    rng = np.random.default_rng(np.random.SeedSequence(seed, spawn_key=(place, unit.index)))
    with np.errstate(all="ignore"):  # what comes out is judged, whatever the arithmetic met on the way
        _WORK[unit.work](bench, rng, unit.size)
    bench.judge_overruns()
    return bench.tally.results
