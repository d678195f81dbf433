"""Plant faults in the generated C, one at a time, and see whether `agree` finds each.

    python -m build_checks.mutate arms/bench_six.toml

A fault that no check notices is either no fault or a hole in the checks. It is none where the compiler makes the same
machine code of it, where its results are the original's on many other inputs (`mutate_triage`) or differ by less than
the promised accuracy, and where `mutate_known` has the reason. Every mutant is compiled and judged in a process of its
own, since some of them crash or never end.
"""

from __future__ import annotations

import argparse
import hashlib
import multiprocessing
import os
import resource
import subprocess
import sys
import tempfile
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cache
from itertools import islice
from multiprocessing.connection import Connection
from pathlib import Path

import numpy as np

from build_checks.agree import Settings, agree
from build_checks.agree_bench import Bench
from build_checks.compile import FLAGS, Kinematics, compiled, find_compiler
from build_checks.mutate_kinds import Kind, Mutant, mutants
from build_checks.mutate_known import why_equivalent
from build_checks.mutate_tokens import compiled_lines, read_source
from build_checks.mutate_triage import Difference, difference, make_inputs, results
from codegen.armfile import read_arm
from codegen.errors import CheckFailedError, Fault
from codegen.model import Arm
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate

FAST, SLOW = 1000, 16_000  # samples: of every mutant, and once more of those that survive
_NOT_COMPILED, _CRASHED = "does not compile", "crashes or never ends"
_HARMLESS = (Difference.NONE.value, Difference.ROUNDING.value)
PORTABLE = ("-U__GNUC__", "-U__SSE2__")  # the C that other compilers see


@dataclass(frozen=True, slots=True)
class Outcome:
    """One mutant.

    caught_by   names of the checks that failed, or what happened instead; empty: it survived
    equivalent  why a survivor behaves as the original; "" when that is not known
    difference  of a survivor from the original
    """

    mutant: Mutant
    caught_by: tuple[str, ...]
    equivalent: str = ""
    difference: str = ""

    @property
    def counts(self) -> bool:
        """Whether it was a fault at all."""
        return self.caught_by != (_NOT_COMPILED,) and not self.equivalent


@dataclass(frozen=True, slots=True)
class Original:
    """The C that faults are planted in, with compiler flags that choose its variant; seconds of the processor that one
    mutant may take."""

    arm: Arm
    files: Mapping[str, str]
    options: Options
    flags: tuple[str, ...] = ()
    seconds: int = 30

    @property
    def file(self) -> str:
        return f"{self.options.prefix}_kin.c"

    def with_fault(self, mutant: Mutant) -> dict[str, str]:
        return {**self.files, self.file: mutant.planted(self.files[self.file])}


def faults(original: Original) -> list[Mutant]:
    """Every fault that can be planted in the lines that are compiled on this machine."""
    with tempfile.TemporaryDirectory() as name:
        for file, text in original.files.items():
            (Path(name) / file).write_text(text)
        lines = compiled_lines(Path(name), original.file, original.flags)
        if original.flags:  # only what the plain variant leaves out
            lines -= compiled_lines(Path(name), original.file, ())
    return mutants(read_source(original.files[original.file]), lines)


def spread(found: Sequence[Mutant], each: int) -> list[Mutant]:
    """At most `each` of every kind, evenly over the file."""
    chosen = []
    for kind in Kind:
        rows = [mutant for mutant in found if mutant.kind is kind]
        step = max(1, -(-len(rows) // each))
        chosen += list(islice(rows, 0, None, step))
    return chosen


def judge(
    original: Original, chosen: Sequence[Mutant], tell: Callable[[Outcome], None] | None = None, processes: int = 2
) -> list[Outcome]:
    """What became of each mutant. Raises when the original itself does not agree."""
    with _compiler(original.flags), ThreadPoolExecutor(processes) as threads:
        with _Judge(original) as judge_:
            wrong = judge_.failures(dict(original.files), FAST)
        if wrong:
            what = f"the C does not agree before a fault is planted: {', '.join(wrong)}"
            raise CheckFailedError(Fault(original.arm.name, what))
        code = _machine_code(original, dict(original.files))
        shares = [list(chosen[i::processes]) for i in range(processes)]
        parts = threads.map(lambda share: _judge_share(original, code, share, tell), shares)
        return sorted((row for part in parts for row in part), key=lambda row: (row.mutant.line, str(row.mutant)))


def _judge_share(
    original: Original, code: str, share: list[Mutant], tell: Callable[[Outcome], None] | None
) -> list[Outcome]:
    found = []
    with _Judge(original) as judge_:
        for mutant in share:
            outcome = _outcome(original, code, judge_, mutant)
            if tell:
                tell(outcome)
            found.append(outcome)
    return found


def _outcome(original: Original, code: str, judge_: _Judge, mutant: Mutant) -> Outcome:
    files = original.with_fault(mutant)
    caught = judge_.failures(files, FAST)
    if caught:
        return Outcome(mutant, caught)
    if _machine_code(original, files) == code:
        return Outcome(mutant, (), "the compiler makes the same machine code of it")
    line = original.files[original.file].split("\n")[mutant.line - 1]
    reason = why_equivalent(mutant, line)
    if reason:
        return Outcome(mutant, (), reason)
    difference = judge_.difference(files)
    if difference in _HARMLESS:
        return Outcome(mutant, (), difference)
    return Outcome(mutant, judge_.failures(files, SLOW), "", difference)


def _machine_code(original: Original, files: dict[str, str]) -> str:
    """Digest of the object code."""
    with tempfile.TemporaryDirectory() as name:
        for file, text in files.items():
            (Path(name) / file).write_text(text)
        flags = [flag for flag in FLAGS if flag != "-shared"]
        command = [find_compiler(), *flags, "-S", "-o", "-", original.file]
        return hashlib.sha256(subprocess.run(command, cwd=name, capture_output=True, check=True).stdout).hexdigest()


@contextmanager
def _compiler(flags: tuple[str, ...]) -> Iterator[None]:
    """$CC as a script that adds flags, where there are any."""
    if not flags:
        yield
        return
    before = os.environ.get("CC")
    with tempfile.TemporaryDirectory() as name:
        script = Path(name) / "cc"
        script.write_text(f'#!/bin/sh\nexec gcc "$@" {" ".join(flags)}\n')
        script.chmod(0o755)
        os.environ["CC"] = str(script)
        try:
            yield
        finally:
            if before is None:
                del os.environ["CC"]
            else:
                os.environ["CC"] = before


# --- a process that judges, and is replaced when it dies ---


class _Judge:
    def __init__(self, original: Original) -> None:
        self._original = original
        self._start()

    def _start(self) -> None:
        context = multiprocessing.get_context("spawn")
        self._here, there = context.Pipe()
        arguments = (there, self._original)
        self._process = context.Process(target=_serve, args=arguments, daemon=True)
        self._process.start()
        there.close()

    def failures(self, files: dict[str, str], samples: int) -> tuple[str, ...]:
        """Names of the checks that fail, or what else is wrong; empty when all agrees."""
        return self._ask(files, samples)

    def difference(self, files: dict[str, str]) -> str:
        """How its results differ from the original's."""
        return self._ask(files, 0)[0]

    def _ask(self, files: dict[str, str], samples: int) -> tuple[str, ...]:
        try:
            self._here.send((files, samples))
            found: tuple[str, ...] = self._here.recv()
        except (EOFError, ConnectionError):
            found = self._ended()
        return found

    def _ended(self) -> tuple[str, ...]:
        """The system ended the process for what the mutant did; that it stopped by itself would be our own fault."""
        self._process.join()
        code = self._process.exitcode
        if code is None or code >= 0:
            raise RuntimeError(f"the process that judges mutants stopped with exit status {code}")
        self._end()
        self._start()
        return (_CRASHED,)

    def _end(self) -> None:
        self._here.close()
        self._process.kill()
        self._process.join()

    def __enter__(self) -> _Judge:
        return self

    def __exit__(self, *_: object) -> None:
        self._end()


def _serve(there: Connection, original: Original) -> None:
    """Answers requests (files, samples): what `agree` finds, or with 0 samples the difference from the original."""
    compare = cache(lambda: _Comparison(original))
    while True:
        try:
            files, samples = there.recv()
        except EOFError:
            return
        _allow(original.seconds)
        failures = _failures(original.arm, files, original.options, samples) if samples else compare().of(files)
        there.send(failures)


class _Comparison:
    """The original's results, kept to be compared with many others."""

    def __init__(self, original: Original) -> None:
        self._original = original
        with compiled(dict(original.files), original.options) as library, np.errstate(all="ignore"):
            self._bench = Bench(original.arm, library)
            self._inputs = make_inputs(self._bench)
            self._right = results(self._bench.c, self._inputs)

    def of(self, files: dict[str, str]) -> tuple[str]:
        with compiled(files, self._original.options) as library, np.errstate(all="ignore"):
            other = results(Kinematics(library), self._inputs)
            return (difference(self._bench, self._inputs, self._right, other).value,)


def _allow(seconds: int) -> None:
    """The system ends this process when the next job takes longer."""
    used = resource.getrusage(resource.RUSAGE_SELF)
    soft = int(used.ru_utime + used.ru_stime) + seconds
    resource.setrlimit(resource.RLIMIT_CPU, (soft, resource.getrlimit(resource.RLIMIT_CPU)[1]))


def _failures(arm: Arm, files: dict[str, str], options: Options, samples: int) -> tuple[str, ...]:
    try:
        report = agree(arm, files, options, Settings(samples=samples, processes=1))
    except CheckFailedError:
        return (_NOT_COMPILED,)
    return tuple(result.check.name for result in report.results if result.failed)


# --- the report ---


def table(outcomes: Sequence[Outcome]) -> str:
    """Share caught by kind, then every survivor."""
    lines = [f"{'fault':60} planted  caught  equivalent  survived"]
    for kind in Kind:
        rows = [row for row in outcomes if row.mutant.kind is kind and row.caught_by != (_NOT_COMPILED,)]
        if rows:
            lines.append(f"{kind.value:60} {_figures(rows)}")
    lines.append(f"{'all':60} {_figures([row for row in outcomes if row.caught_by != (_NOT_COMPILED,)])}")
    return "\n".join([*lines, *_reasons(outcomes), *_survivors(outcomes)])


def _figures(rows: Sequence[Outcome]) -> str:
    caught = sum(bool(row.caught_by) for row in rows)
    equivalent = sum(bool(row.equivalent) for row in rows)
    return f"{len(rows):7}  {caught:6}  {equivalent:10}  {len(rows) - caught - equivalent:8}"


def _reasons(outcomes: Sequence[Outcome]) -> list[str]:
    counted = Counter(row.equivalent for row in outcomes if row.equivalent)
    return ["", "not faults:", *(f"{count:5}  {reason}" for reason, count in sorted(counted.items()))]


def _survivors(outcomes: Sequence[Outcome]) -> list[str]:
    return ["", "survived:", *(f"  {row.mutant} ({row.difference})" for row in survivors(outcomes))]


def survivors(outcomes: Sequence[Outcome]) -> list[Outcome]:
    return [row for row in outcomes if row.counts and not row.caught_by]


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(description="Plant faults in generated C and see whether agree finds them.")
    parser.add_argument("arm", type=Path, metavar="ARM.toml")
    parser.add_argument("--real", choices=[real.c_name for real in RealType], default="float")
    parser.add_argument("--math", choices=[kind.value for kind in Mathematics], default="own")
    parser.add_argument("--each", type=int, default=10**6, help="at most so many of each kind")
    parser.add_argument("--function", default="", help="only in functions whose name contains this")
    parser.add_argument("--portable", action="store_true", help="only what compilers other than GCC and clang see")
    wanted = parser.parse_args(arguments)
    real = next(kind for kind in RealType if kind.c_name == wanted.real)
    arm, options = read_arm(wanted.arm).arm, Options(real, Mathematics(wanted.math))
    original = Original(arm, generate(arm, options), options, PORTABLE if wanted.portable else ())
    chosen = [mutant for mutant in spread(faults(original), wanted.each) if wanted.function in mutant.function]
    print(f"{len(chosen)} faults", file=sys.stderr)
    outcomes = judge(original, chosen, _tell)
    print(table(outcomes))
    return int(bool(survivors(outcomes)))


def _tell(outcome: Outcome) -> None:
    if not outcome.caught_by and not outcome.equivalent:
        print(f"survived: {outcome.mutant}", file=sys.stderr, flush=True)


if __name__ == "__main__":
    sys.exit(main())
