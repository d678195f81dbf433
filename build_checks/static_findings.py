"""What a static check found: one frozen row each, and how the checks run their tools."""

from __future__ import annotations

import shutil
import subprocess
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from codegen.errors import CheckFailedError, Fault


@dataclass(frozen=True, slots=True, order=True)
class Finding:
    """One thing that a check says of the C.

    check  the check, such as "gcc C99"
    file   name of the C file; "" when it is about the whole
    line   0 when it is about the whole file
    rule   the tool's own name of what it found
    what   one line
    """

    check: str
    file: str
    line: int
    rule: str
    what: str

    def __str__(self) -> str:
        place = f"{self.file}:{self.line}: " if self.line else f"{self.file}: " if self.file else ""
        return f"{self.check}: {place}{self.what} [{self.rule}]"


@contextmanager
def laid_out(files: Mapping[str, str]) -> Iterator[Path]:
    """A folder that holds the files while the block runs."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for file, text in files.items():
            (folder / file).write_text(text)
        yield folder


def sources(files: Mapping[str, str]) -> list[str]:
    """Names of the C files, sorted."""
    return sorted(name for name in files if name.endswith(".c"))


def run_tool(command: Sequence[str], folder: Path) -> subprocess.CompletedProcess[str]:
    """Runs a tool; an error that says how to install it when it is not there."""
    if shutil.which(command[0]) is None:
        hint = f"apt-get install {command[0]}"
        raise CheckFailedError(Fault("static checks", f"{command[0]} is not installed", hint=hint))
    return subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False, timeout=300)
