"""`linkwright generate`: from an arm file to the C."""

from __future__ import annotations

from codegen.commands.arguments import AngleError, Angles, ArmPath, Math, OutFolder, Prefix, Real, Wanted, wanted
from codegen.commands.beside import EvidenceWanted, SelfTest, SelfTestSize, check_size, evidence_of, self_test_of
from codegen.commands.console import say
from codegen.writing import write_files


def generate(
    arm: ArmPath,
    out: OutFolder,
    real: Real = "float",
    math: Math = "own",
    prefix: Prefix = "arm",
    angle_error: AngleError = 2,
    angles: Angles = "real",
    self_test: SelfTest = False,
    self_test_size: SelfTestSize = None,
    evidence: EvidenceWanted = False,
) -> None:
    """Derive the kinematics of an arm and write them as C.

    The files are PREFIX_kin.c and PREFIX_kin.h. Nothing is written where the arm has no solution.

    \b
    Example:
      linkwright generate arms/vial_picker.toml --out firmware/src --real float
    """
    check_size(self_test, self_test_size)
    files = all_files(wanted(arm, real, math, prefix, angle_error, angles), self_test, self_test_size, evidence)
    write_files(out, files)
    say(f"wrote {', '.join(str(out / name) for name in sorted(files))}")


def all_files(what: Wanted, self_test: bool, self_test_size: int | None, evidence: bool) -> dict[str, str]:
    """The C and what is asked for beside it."""
    files = what.generated()
    if self_test:
        files |= self_test_of(what, files, self_test_size)
    if evidence:
        files |= evidence_of(what, files)
    return files
