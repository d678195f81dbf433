"""The generated C under the sanitizers and valgrind, at edge inputs and random ones.

    python -m build_checks.sanitize arms/*.toml

What runs is the fuzz target with records made here, so that each run is the same; beside the sanitizers' own findings
it reports every promise of the header that is broken.
"""

from __future__ import annotations

import argparse
import re
import sys
import tempfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from build_checks.fuzz import CHECKS, COMPILE, build_target, random_records, seed_records
from build_checks.static_findings import Finding, run_tool
from codegen.armfile import read_arm
from codegen.model import Arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

RANDOM_RECORDS = 2000
_SEED = 5
_SHOWN = 6  # lines of one run


@dataclass(frozen=True, slots=True)
class Sanitizer:
    """One way to run the C watched.

    compile   the compiler and its flags, before the sources
    run       what stands before the program
    share     of the random records: valgrind is slow
    telling   what a line that reports something looks like
    """

    name: str
    compile: tuple[str, ...]
    run: tuple[str, ...] = ()
    share: float = 1.0
    telling: str = r"runtime error|ERROR: AddressSanitizer|SUMMARY|broken promise"

    @property
    def programs(self) -> tuple[str, ...]:
        return (self.compile[0], *self.run[:1])


_MAIN = (*COMPILE, "-DFUZZ_MAIN")
_ADDRESS = f"-fsanitize=address,{CHECKS}"
SANITIZERS = (
    Sanitizer("gcc, address and undefined behaviour", ("gcc", *_MAIN, _ADDRESS, "-fno-sanitize-recover=all")),
    Sanitizer("clang, address and undefined behaviour", ("clang", *_MAIN, _ADDRESS, "-fno-sanitize-recover=all")),
    Sanitizer(
        "valgrind",
        ("gcc", *_MAIN),
        ("valgrind", "--quiet", "--error-exitcode=9"),
        0.1,
        r"^==\d+== +[A-Z]|(?:at|by) 0x.*_kin\.c:\d+|broken promise",
    ),
)


def sanitizer_findings(
    arm: Arm, files: Mapping[str, str], options: Options, sanitizer: Sanitizer, randoms: int = RANDOM_RECORDS
) -> tuple[Finding, ...]:
    """What one run reports; empty when it ran to its end in silence."""
    records = [*seed_records(arm, options.real), *random_records(arm, round(randoms * sanitizer.share), _SEED)]
    with tempfile.TemporaryDirectory(prefix="linkwright-") as name:
        folder = Path(name)
        program = build_target(arm, files, options, folder, sanitizer.compile, "watched")
        (folder / "records").write_bytes(b"".join(records))
        done = run_tool([*sanitizer.run, str(program), "records"], folder)
    if done.returncode == 0 and done.stdout == f"{len(records)} records\n":
        return ()
    said = [line for line in done.stderr.splitlines() if re.search(sanitizer.telling, line)][:_SHOWN]
    text = said or done.stderr.splitlines()[-_SHOWN:] or [f"exit status {done.returncode}"]
    return tuple(_finding(sanitizer, line) for line in text)


def _finding(sanitizer: Sanitizer, line: str) -> Finding:
    place = re.search(r"(\w+_kin\.c):(\d+)", line)
    file, number = (place[1], int(place[2])) if place else ("", 0)
    return Finding(sanitizer.name, file, number, "sanitizer", re.sub(r"^==\d+==\s*", "", line.strip()))


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(description="Run the generated C of arm files under sanitizers and valgrind.")
    parser.add_argument("arms", nargs="+", type=Path, metavar="ARM.toml")
    wanted = parser.parse_args(arguments)
    found: list[Finding] = []
    for path in wanted.arms:
        arm = read_arm(path).arm
        for real in RealType:
            options = Options(real=real)
            files = generate(arm, options)
            for sanitizer in SANITIZERS:
                rows = sanitizer_findings(arm, files, options, sanitizer)
                found += rows
                print(f"{path.name}, {real.c_name}, {sanitizer.name}: {len(rows) or 'no'} findings")
                print("".join(f"  {row}\n" for row in rows), end="")
    return int(bool(found))


if __name__ == "__main__":
    sys.exit(main())
