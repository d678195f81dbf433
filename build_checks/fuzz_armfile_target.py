"""What the arm file reader is fuzzed with: a process that calls it with any bytes.

It imports nothing of the tool before the fuzzer watches imports, or no path through the reader would be counted.
"""

from __future__ import annotations

import io
import sys
from pathlib import Path, PosixPath
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from codegen.errors import ArmFileError


class HeldFile(PosixPath):
    """A file that lies in memory only: writing each input to a disk takes longer than reading it as an arm file."""

    content = b""

    def open(self, *_: object, **__: object) -> io.BytesIO:  # type: ignore[override]
        return io.BytesIO(self.content)


def check_outcome(content: bytes) -> None:
    """Reads `content` as an arm file; AssertionError, or what the reader raised, when it breaks its promise."""
    from codegen.armfile import read_arm
    from codegen.errors import ArmFileError

    path = HeldFile("arm.toml")
    path.content = content
    refusal: ArmFileError | None = None
    try:
        arm = read_arm(path).arm
    except ArmFileError as error:
        refusal = error
    if refusal is not None:
        _check_refusal(refusal, path)
        return
    assert 1 <= len(arm.joints) <= 7, f"{len(arm.joints)} joints"
    assert len(arm.free_indices) == arm.task.joints, "a joint count that does not fit the task"


def _check_refusal(refusal: ArmFileError, path: Path) -> None:
    assert refusal.faults, "an error without a fault"
    for fault in refusal.faults:
        assert fault.where.startswith(str(path)), f"{fault.where!r} does not name the file"
        assert fault.what, "a fault that says nothing"
    assert str(refusal).replace("\n", "").isprintable(), "an error that cannot be printed"


def main() -> int:
    """The fuzzing process, called with libFuzzer's arguments. Ends the process."""
    try:
        import atheris
    except ImportError:
        print("atheris is not installed; python -m pip install atheris", file=sys.stderr)
        return 2
    with atheris.instrument_imports(include=["codegen", "tomllib"]):
        import tomllib  # noqa: F401

        import codegen.armfile  # noqa: F401

    atheris.Setup(["fuzz_armfile", *sys.argv[1:]], check_outcome)
    atheris.Fuzz()
    return 0


if __name__ == "__main__":
    sys.exit(main())
