"""Coverage-guided fuzzing of the arm file reader (atheris, which is libFuzzer for Python).

    python -m build_checks.fuzz_armfile --runs 10000000

Whatever bytes stand in an arm file, the reader gives an arm or an ArmFileError that names the file and can be printed;
it never raises anything else, and never hangs.
"""

from __future__ import annotations

import argparse
import re
import subprocess
import sys
import tempfile
from collections.abc import Sequence
from pathlib import Path

from build_checks.fuzz import FuzzResult, keep_files

_LONGEST = 2048  # bytes of an input
_SECONDS = 20  # an input that takes longer counts as a hang
_SHOWN = 4000
_WORDS = (
    "[arm]", "[base]", "[tool]", "[[joint]]", "name", "convention", "length_unit", "angle_unit", "task", "held", "xyz",
    "rpy", "type", "a", "alpha", "d", "theta", "limits", "max_speed", '"standard"', '"modified"', '"revolute"',
    '"prismatic"', '"m"', '"mm"', '"rad"', '"deg"', '"pose"', '"point_axis"', '"point_pitch"', '"point_yaw"', '"point"',
    '"plane_pose"', '"plane_point"', "nan", "inf", "1e999", "-0.0", "0x7f", "true", "1979-05-27T07:32:00Z", "'''", "#",
    '"""', "\\u0000", "= [", "]", "{", "}", ",", "\n",
)  # fmt: skip


def fuzz_reader(
    examples: Sequence[Path], runs: int, *, seed: int = 1, corpus: Path | None = None, keep: Path | None = None
) -> FuzzResult:
    """Calls the reader `runs` times, from the arm files `examples` on, in a process of its own.

    Inputs that reached something new are kept in `corpus`, for a later run to start from; one that fails in `keep`.
    """
    with tempfile.TemporaryDirectory(prefix="linkwright-fuzz-") as name:
        folder = Path(name)
        corpus = (corpus or folder / "corpus").resolve()
        corpus.mkdir(parents=True, exist_ok=True)
        for path in examples:
            (corpus / path.name).write_bytes(path.read_bytes())
        (folder / "words.dict").write_text("".join(f"{_quoted(word)}\n" for word in _WORDS))
        limits = [f"-runs={runs}", f"-seed={seed}", f"-max_len={_LONGEST}", f"-timeout={_SECONDS}"]
        places = [f"-dict={folder / 'words.dict'}", f"-artifact_prefix={folder}/failed-", str(corpus)]
        command = [sys.executable, "-m", "build_checks.fuzz_armfile_target", *limits, "-print_final_stats=1", *places]
        done = subprocess.run(command, capture_output=True, text=True, check=False, errors="replace")
        keep_files(folder.glob("failed-*"), keep)
        return FuzzResult(_executions(done.stderr), "" if done.returncode == 0 else _told(done.stdout + done.stderr))


def _quoted(word: str) -> str:
    """An entry of libFuzzer's dictionary."""
    return '"' + "".join(f"\\x{byte:02x}" for byte in word.encode()) + '"'


def _executions(text: str) -> int:
    found = re.search(r"stat::number_of_executed_units:\s*(\d+)", text) or re.search(r"Done (\d+) runs", text)
    return int(found.group(1)) if found else 0


def _told(text: str) -> str:
    """From the Python exception on, where there is one."""
    start = text.find("Uncaught Python exception")
    return text[start : start + _SHOWN] if start >= 0 else text[-_SHOWN:]


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(description="Fuzz the arm file reader.")
    parser.add_argument("--arms", type=Path, default=Path("arms"), help="folder of arm files to start from")
    parser.add_argument("--runs", type=int, default=100_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--corpus", type=Path, help="folder that keeps the inputs which reached something new")
    parser.add_argument("--keep", type=Path, help="folder for an input that fails")
    wanted = parser.parse_args(arguments)
    examples = sorted(wanted.arms.glob("*.toml"))
    result = fuzz_reader(examples, wanted.runs, seed=wanted.seed, corpus=wanted.corpus, keep=wanted.keep)
    print(f"arm file reader: {result.executions:,} executions, {result.failure or 'nothing found'}")
    return int(bool(result.failure))


if __name__ == "__main__":
    sys.exit(main())
