"""Coverage-guided fuzzing of the generated C (libFuzzer) with the address and undefined-behaviour sanitizers.

    python -m build_checks.fuzz arms/bench_six.toml --runs 10000000

The target, `fuzz_kin.c`, makes a pose, a seed, joint values and a branch from any bytes and holds the functions to what
the header promises: no NaN out, outputs untouched without a solution, statuses in range, a solution reaches its pose.
What breaks a promise or trips a sanitizer is kept as a file that repeats it.
"""

from __future__ import annotations

import argparse
import re
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import product
from pathlib import Path

import numpy as np

from build_checks.agree_budget import budget_of
from build_checks.compile import AnyArray
from build_checks.reference import Reference
from codegen.armfile import read_arm
from codegen.errors import CheckFailedError, Fault
from codegen.model import Arm, JointKind, Task
from codegen.options import Options, RealType
from codegen.pipeline import generate

TARGET = Path(__file__).with_name("fuzz_kin.c")
RECORD = 256  # bytes of one run; none reads more
CHECKS = "undefined,float-divide-by-zero,float-cast-overflow"
COMPILE = ("-std=c99", "-O1", "-g", "-fno-omit-frame-pointer", "-ffp-contract=off")
RAW_POSE, RAW_SEED, RAW_JOINTS, MOVED, DAMAGED, RAW_BRANCH = 1, 2, 4, 8, 16, 32
_SHOWN = 4000  # characters of a run that failed in an unknown way
_SHOWN_LINES = 20
_TELLING = re.compile(r"broken promise|runtime error|ERROR: |SUMMARY|_kin\.c:\d+|^Base64")
_LISTED = "REVOLUTE"


@dataclass(frozen=True, slots=True)
class FuzzResult:
    """One run: how often the target was called, and what stopped it; "" when nothing did."""

    executions: int
    failure: str


def arm_header(arm: Arm, options: Options) -> str:
    """What the target must know of the arm and its task, as a C header."""
    reference, budget = Reference(arm), budget_of(options, len(arm.joints))
    turning = [i for i in arm.free_indices if arm.joints[i].kind is JointKind.REVOLUTE]
    tasks = [f"#define TASK_{task.name} {number}" for number, task in enumerate(Task)]
    revolute = ", ".join("1" if row.kind is JointKind.REVOLUTE else "0" for row in arm.joints)
    rows = {
        "TASK": f"TASK_{arm.task.name}",
        "REACH": repr(reference.reach),
        "UNIT": repr(budget.unit),
        "SHARE_BUDGET": repr(budget.share),
        "ANGLE_BUDGET": repr(budget.angle),
        "NORMAL_JOINT": str(turning[-1] if turning else -1),
        "FIRST_SLIDE": str(arm.free_indices[0]),
        "LAST_SLIDE": str(arm.free_indices[-1]),
        "RECORD": str(RECORD),
    }
    lines = [*tasks, *(f"#define {name} ({value})" for name, value in rows.items())]
    return "\n".join([*lines, f"static const int {_LISTED}[] = {{{revolute}}};"]) + "\n"


def build_target(
    arm: Arm, files: Mapping[str, str], options: Options, folder: Path, command: Sequence[str], name: str
) -> Path:
    """Compiles the generated files and the target with `command`, a compiler and its flags."""
    for file, text in {**files, "fuzz_arm.h": arm_header(arm, options)}.items():
        (folder / file).write_text(text, encoding="utf-8")
    prefix = options.prefix
    names = [f'-DKIN_HEADER="{prefix}_kin.h"', '-DARM_HEADER="fuzz_arm.h"', f"-DPREFIX={prefix}"]
    sources = [f"-DUPPER={prefix.upper()}", "-I", ".", *sorted(f for f in files if f.endswith(".c")), str(TARGET)]
    done = subprocess.run(
        [*command, *names, *sources, "-o", name, "-lm"], cwd=folder, capture_output=True, text=True, check=False
    )
    if done.returncode != 0:
        raise CheckFailedError(Fault(f"{command[0]}: {TARGET.name}", f"does not compile\n{done.stderr[:_SHOWN]}"))
    return folder / name


def seed_records(arm: Arm, real: RealType) -> list[bytes]:
    """Edge inputs: special numbers in every place, all kinds of queries; padded to one length."""
    dtype = np.float32 if real is RealType.FLOAT else np.float64
    info = np.finfo(dtype)
    special = [0.0, -0.0, 1.0, -1.0, np.nan, np.inf, -np.inf, info.max, -info.max, info.tiny, info.tiny / 8, 0.5, 3.25]
    numbers = np.array(special, dtype=dtype)
    shares = np.array([0, 0x4000, 0xC000, 0x7FFF, 0x8000, 0x2000, 1], dtype=np.uint16)
    kinds = [a | b for a, b in product((0, MOVED, DAMAGED, RAW_POSE, MOVED | DAMAGED), (0, 2, 4, 6, RAW_BRANCH))]
    return [_record(arm, kind, numbers, shares, turn) for kind in kinds for turn in range(len(special))]


def _record(arm: Arm, kinds: int, numbers: AnyArray, shares: AnyArray, turn: int) -> bytes:
    """One record; `turn` shifts which special number stands where."""
    count = len(arm.joints)

    def raw(places: int, start: int) -> bytes:
        return bytes(np.array([numbers[(start + turn * (i % 3)) % len(numbers)] for i in range(places)]).tobytes())

    def scaled(start: int) -> bytes:
        return bytes(np.array([shares[(start + turn * i) % len(shares)] for i in range(count)]).tobytes())

    parts = [bytes([kinds]), raw(count, turn) if kinds & RAW_JOINTS else scaled(turn)]
    parts += [raw(count, 2) if kinds & RAW_SEED else scaled(turn + 3), turn.to_bytes(4, "little")]
    parts += [raw(12, turn + 1) if kinds & RAW_POSE else b"", scaled(turn)[:6], bytes([turn]), raw(1, turn)]
    return b"".join(parts)[:RECORD].ljust(RECORD, b"\0")


def random_records(arm: Arm, count: int, seed: int) -> list[bytes]:
    """Records of random bytes, mostly of poses that the arm can take."""
    rng = np.random.default_rng(seed)
    kinds = rng.choice([0, 0, 0, MOVED, DAMAGED, RAW_POSE, 2, 4, 32], count).astype(np.uint8)
    body = rng.integers(0, 256, (count, RECORD - 1), dtype=np.uint8)
    return [bytes([kind]) + row.tobytes() for kind, row in zip(kinds.tolist(), body, strict=True)]


def fuzz_command() -> list[str]:
    return ["clang", *COMPILE, f"-fsanitize=fuzzer,address,{CHECKS}", "-fno-sanitize-recover=all"]


def fuzz(
    arm: Arm, files: Mapping[str, str], options: Options, runs: int, *, seed: int = 1, keep: Path | None = None
) -> FuzzResult:
    """Calls the target `runs` times. An input that fails is copied into `keep`."""
    with tempfile.TemporaryDirectory(prefix="linkwright-fuzz-") as name:
        folder = Path(name)
        program = build_target(arm, files, options, folder, fuzz_command(), "fuzz")
        corpus = folder / "corpus"
        corpus.mkdir()
        for number, record in enumerate(seed_records(arm, options.real)):
            (corpus / f"{number:04}").write_bytes(record)
        limits = [f"-max_len={RECORD}", f"-runs={runs}", f"-seed={seed}", "-timeout=20", "-print_final_stats=1"]
        done = subprocess.run(
            [str(program), *limits, "-artifact_prefix=failed-", "corpus"],
            cwd=folder, capture_output=True, text=True, check=False, errors="replace",
        )  # fmt: skip
        keep_files(folder.glob("failed-*"), keep)
        return FuzzResult(_executions(done.stderr), "" if done.returncode == 0 else telling_lines(done.stderr))


def telling_lines(text: str) -> str:
    """Of a sanitizer's report: what was broken, and the calls of the generated functions that led there."""
    lines = [line.strip() for line in text.splitlines() if _TELLING.search(line)]
    return "\n".join(lines[:_SHOWN_LINES]) or text[-_SHOWN:]


def keep_files(found: Iterable[Path], keep: Path | None) -> None:
    """Copies the inputs that failed into the folder `keep`, where there is one."""
    if keep is not None:
        keep.mkdir(parents=True, exist_ok=True)
        for path in sorted(found):
            shutil.copy(path, keep)


def _executions(text: str) -> int:
    found = re.search(r"stat::number_of_executed_units:\s*(\d+)", text)
    return int(found.group(1)) if found else 0


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(description="Fuzz the generated C of arm files with libFuzzer.")
    parser.add_argument("arms", nargs="+", type=Path, metavar="ARM.toml")
    parser.add_argument("--runs", type=int, default=1_000_000, help="executions for each arm and number type")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--real", choices=[real.c_name for real in RealType], action="append")
    parser.add_argument("--keep", type=Path, help="folder for inputs that fail")
    wanted = parser.parse_args(arguments)
    reals = [real for real in RealType if not wanted.real or real.c_name in wanted.real]
    failed = False
    for path, real in product(wanted.arms, reals):
        arm, options = read_arm(path).arm, Options(real=real)
        result = fuzz(arm, generate(arm, options), options, wanted.runs, seed=wanted.seed, keep=wanted.keep)
        failed = failed or bool(result.failure)
        print(f"{path.name}, {real.c_name}: {result.executions:,} executions, {result.failure or 'nothing found'}")
    return int(failed)


if __name__ == "__main__":
    sys.exit(main())
