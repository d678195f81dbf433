"""Branch coverage of the generated C by the agreement vectors, measured by gcc and gcov.

    python -m build_checks.coverage arms/*.toml

`agree` runs as ever, in a process of its own, on C compiled with counters. What it never reaches is listed: such code is
to be removed, needs a vector, or has its reason in `coverage_known`.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from build_checks.coverage_known import why_unreached
from build_checks.static_findings import run_tool
from codegen.armfile import read_arm
from codegen.errors import CheckFailedError, Fault
from codegen.options import Options, RealType
from codegen.pipeline import generate

SAMPLES = 20_000


@dataclass(frozen=True, slots=True)
class Unreached:
    """A line that never ran, or a branch never taken: `way` counts the branches of its line from 1, as gcov has them."""

    function: str
    line: int
    code: str
    way: int = 0
    ways: int = 0
    reason: str = ""

    def __str__(self) -> str:
        what = f"branch {self.way} of {self.ways} never taken" if self.way else "never run"
        return f"line {self.line}, {self.function}: {what}: {self.code}{f'  ({self.reason})' if self.reason else ''}"


@dataclass(frozen=True, slots=True)
class Coverage:
    """Counts of lines with code and of branches, those reached, and what was not."""

    lines: int
    lines_run: int
    branches: int
    branches_taken: int
    unreached: tuple[Unreached, ...]

    @property
    def unexplained(self) -> tuple[Unreached, ...]:
        return tuple(row for row in self.unreached if not row.reason)


def coverage(arm_file: Path, options: Options, samples: int = SAMPLES, seed: int = 1) -> Coverage:
    """What the agreement vectors reach in the C of an arm file."""
    with tempfile.TemporaryDirectory(prefix="linkwright-coverage-") as name:
        folder = Path(name)
        _run_agree(arm_file, options, samples, seed, folder)
        done = run_tool(["gcov", "--json-format", "--branch-probabilities", "--stdout", *_data(folder)], folder)
        files = json.loads(done.stdout)["files"]
        file = f"{options.prefix}_kin.c"
        lines = next(row["lines"] for row in files if Path(row["file"]).name == file)
    arm = read_arm(arm_file).arm
    return _summary(lines, _Text(arm.name, generate(arm, options)[file].splitlines()))


def _data(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.glob("*_kin.gcda"))


def _run_agree(arm_file: Path, options: Options, samples: int, seed: int, folder: Path) -> None:
    """The counters are written when the process ends, beside the compiler's notes."""
    compiler = folder / "counting-cc"
    # without attributes, which only tell what to inline: or each place of a call would count for itself
    compiler.write_text(
        '#!/bin/sh\ngcc "$@" -O0 --coverage "-D__attribute__(what)=" && cp ./*.gcno "$GCOV_PREFIX"\n', encoding="utf-8"
    )
    compiler.chmod(0o755)
    words = [str(arm_file.resolve()), options.real.c_name, options.mathematics.value, options.prefix, samples, seed]
    command = [sys.executable, "-c", _AGREE, *map(str, words)]
    environment = {**os.environ, "CC": str(compiler), "GCOV_PREFIX": str(folder), "GCOV_PREFIX_STRIP": "99"}
    done = subprocess.run(command, env=environment, capture_output=True, text=True, check=False)
    if done.returncode != 0 or not _data(folder):
        raise CheckFailedError(Fault("coverage", f"agree does not run with counters\n{done.stderr[-2000:]}"))


_AGREE = """
import sys
from pathlib import Path
from build_checks.agree import Settings, agree
from codegen.armfile import read_arm
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate

file, real, mathematics, prefix, samples, seed = sys.argv[1:]
arm = read_arm(Path(file)).arm
options = Options(next(kind for kind in RealType if kind.c_name == real), Mathematics(mathematics), prefix)
agree(arm, generate(arm, options), options, Settings(int(samples), int(seed), processes=1))
"""


@dataclass(frozen=True, slots=True)
class _Text:
    """The generated C of an arm."""

    arm: str
    lines: Sequence[str]


def _summary(lines: list[dict[str, object]], text: _Text) -> Coverage:
    rows = [_Line(row, text) for row in lines]
    branches = [taken for row in rows for taken in row.branches]
    return Coverage(
        len(rows),
        sum(row.runs > 0 for row in rows),
        len(branches),
        sum(taken > 0 for taken in branches),
        tuple(found for row in rows for found in row.unreached()),
    )


class _Line:
    """One line of gcov's report; a line that never ran is reported once, not for each of its branches."""

    def __init__(self, row: dict[str, object], text: _Text) -> None:
        self.arm = text.arm
        self.number, self.runs = int(str(row["line_number"])), int(str(row["count"]))
        self.function = str(row.get("function_name", ""))
        found = row["branches"]
        self.branches = [int(branch["count"]) for branch in found] if isinstance(found, list) else []
        self.code = text.lines[self.number - 1].strip()

    def unreached(self) -> Iterator[Unreached]:
        if self.runs == 0:
            yield self._row(0)
        else:
            yield from (self._row(way) for way, taken in enumerate(self.branches, start=1) if taken == 0)

    def _row(self, way: int) -> Unreached:
        reason = why_unreached(self.arm, self.function, self.code)
        return Unreached(self.function, self.number, self.code, way, len(self.branches), reason)


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(description="Branch coverage of generated C by the agreement vectors.")
    parser.add_argument("arms", nargs="+", type=Path, metavar="ARM.toml")
    parser.add_argument("--real", choices=[real.c_name for real in RealType], default="float")
    parser.add_argument("--samples", type=int, default=SAMPLES)
    wanted = parser.parse_args(arguments)
    real = next(kind for kind in RealType if kind.c_name == wanted.real)
    open_rows = 0
    for path in wanted.arms:
        found = coverage(path, Options(real), wanted.samples)
        open_rows += len(found.unexplained)
        lines, branches = f"{found.lines_run} of {found.lines} lines", f"{found.branches_taken} of {found.branches}"
        print(f"{path.name}, {real.c_name}: {lines}, {branches} branches")
        print("".join(f"  {row}\n" for row in found.unreached), end="")
    return int(bool(open_rows))


if __name__ == "__main__":
    sys.exit(main())
