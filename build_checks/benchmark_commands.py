"""How long the commands take from a cold start, imports included: python -m build_checks.benchmark_commands

Each command runs in a process of its own, several times; the medians of wall-clock and of processor time (of all
processes of the command together) are printed as a row of a Markdown table. The first depends on what else runs on the
machine, the second hardly does.
"""

from __future__ import annotations

import platform
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

from codegen.places import ARMS

_RUNS = 5
_GENERATED = ("bench_six", "parallel_six", "dosing_trio")
_AGREED = ("vial_picker", "bench_six")


def seconds(arguments: Sequence[str], runs: int) -> tuple[float, float]:
    """Median wall-clock and processor time of `linkwright ARGUMENTS`."""
    times = [_once(arguments) for _ in range(runs)]
    return statistics.median(wall for wall, _ in times), statistics.median(processor for _, processor in times)


def _once(arguments: Sequence[str]) -> tuple[float, float]:
    begin, before = time.perf_counter(), _processor_seconds()
    command = [sys.executable, "-m", "codegen.main", *arguments]
    done = subprocess.run(command, capture_output=True, check=False)
    if done.returncode not in (0, 1):
        raise SystemExit(done.stderr.decode())
    return time.perf_counter() - begin, _processor_seconds() - before


def _processor_seconds() -> float:
    usage = resource.getrusage(resource.RUSAGE_CHILDREN)
    return usage.ru_utime + usage.ru_stime


def main() -> None:
    print(f"Python {platform.python_version()}, {platform.machine()}")
    print("| command | s | processor s |", "| --- | ---: | ---: |", sep="\n")
    with tempfile.TemporaryDirectory() as folder:
        for arm in _GENERATED:
            _row(f"generate {arm}", ["generate", str(ARMS / f"{arm}.toml"), "--out", str(Path(folder) / arm)], _RUNS)
        for arm in _AGREED:
            _row(f"agree {arm}", ["agree", str(ARMS / f"{arm}.toml"), "--samples", "100000"], 1)


def _row(what: str, arguments: Sequence[str], runs: int) -> None:
    wall, processor = seconds(arguments, runs)
    print(f"| {what} | {wall:.2f} | {processor:.2f} |", flush=True)


if __name__ == "__main__":
    main()
