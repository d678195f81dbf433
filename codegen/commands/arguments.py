"""Arguments that several commands share, and what they stand for."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.console import show_faults, working
from codegen.errors import CallError, Fault
from codegen.options import Arithmetic, Mathematics, Options, RealType

if TYPE_CHECKING:
    from codegen.armfile import ArmFile
    from codegen.emit.files import Source

LEAST_ANGLE_ERROR = 2  # ulp; the default
_REALS = tuple(real.c_name for real in RealType)
_MATHEMATICS = tuple(mathematics.value for mathematics in Mathematics)
_ARITHMETICS = tuple(arithmetic.value for arithmetic in Arithmetic)


def _complete(words: tuple[str, ...]) -> Callable[[str], list[str]]:
    def completion(incomplete: str) -> list[str]:
        return [word for word in words if word.startswith(incomplete)]

    return completion


ArmPath = Annotated[Path, typer.Argument(metavar="ARM.toml", help="The arm file.", show_default=False)]
OutFolder = Annotated[
    Path, typer.Option("--out", metavar="DIR", help="Folder of the C files; made if missing.", show_default=False)
]
Real = Annotated[
    str,
    typer.Option("--real", metavar="|".join(_REALS), help="Number type of the C.", autocompletion=_complete(_REALS)),
]
Math = Annotated[
    str,
    typer.Option(
        "--math",
        metavar="|".join(_MATHEMATICS),
        help="Sine, cosine, arc tangent and root: the C's own, or the compiler's library.",
        autocompletion=_complete(_MATHEMATICS),
    ),
]
Prefix = Annotated[
    str, typer.Option("--prefix", metavar="NAME", help="First part of every external name and of the file names.")
]
AngleError = Annotated[
    int,
    typer.Option(
        "--angle-error",
        metavar="ULP",
        help=f"Largest error of the C's own sine, cosine and arc tangent in units in the last place, "
        f"{LEAST_ANGLE_ERROR} or more; more gives shorter, faster code.",
    ),
]
Angles = Annotated[
    str,
    typer.Option(
        "--angles",
        metavar="|".join(_ARITHMETICS),
        help="What the C's own sine, cosine and arc tangent compute in: the number type, or whole numbers, which is "
        "quicker on 32-bit processors without a float unit (float only).",
        autocompletion=_complete(_ARITHMETICS),
    ),
]
AsJson = Annotated[bool, typer.Option("--json", help="Print JSON for a machine to read.")]


def options_of(real: str, math: str, prefix: str, angle_error: int, angles: str = "real") -> Options:
    """The options of the generated C; CallError holds everything that is wrong with them."""
    faults = [
        *_real_fault(real),
        *_choice_fault("--math", math, _MATHEMATICS),
        *_prefix_fault(prefix),
        *_angle_error_fault(angle_error, math),
        *_choice_fault("--angles", angles, _ARITHMETICS),
        *_angles_fault(angles, real, math),
    ]
    if faults:
        raise CallError(*faults)
    wanted = next(kind for kind in RealType if kind.c_name == real)
    return Options(wanted, Mathematics(math), prefix, angle_error, Arithmetic(angles))


def _real_fault(real: str) -> list[Fault]:
    if real == "fixed":
        return [Fault("--real", "fixed-point numbers cannot be generated yet", "choose float or double")]
    return _choice_fault("--real", real, _REALS)


def _choice_fault(option: str, word: str, accepted: tuple[str, ...]) -> list[Fault]:
    if word in accepted:
        return []
    from codegen.armfile_names import did_you_mean

    hint = did_you_mean(word, accepted) or f"accepted are {', '.join(sorted(accepted))}"
    return [Fault(option, f'unknown word "{word}"', hint)]


def _prefix_fault(prefix: str) -> list[Fault]:
    """At file scope, names that begin with _ belong to the compiler (ISO/IEC 9899:1999, 7.1.3)."""
    from codegen.armfile_names import identifier_problem

    problem, hint = identifier_problem(prefix)
    if not problem and prefix.startswith("_"):
        problem, hint = "is reserved for the C compiler", f'write "{prefix.lstrip("_") or "arm"}", say'
    return [Fault("--prefix", f'"{prefix}" {problem}', hint)] if problem else []


def _angle_error_fault(angle_error: int, math: str) -> list[Fault]:
    if angle_error < LEAST_ANGLE_ERROR:
        return [Fault("--angle-error", f"{angle_error} ulp cannot be promised", f"give {LEAST_ANGLE_ERROR} or more")]
    if angle_error > LEAST_ANGLE_ERROR and math == Mathematics.LIBM.value:
        return [Fault("--angle-error", "says nothing about --math libm", "leave one of the two out")]
    return []


def _angles_fault(angles: str, real: str, math: str) -> list[Fault]:
    if angles != Arithmetic.INTEGER.value:
        return []
    if math == Mathematics.LIBM.value:
        return [Fault("--angles", "says nothing about --math libm", "leave one of the two out")]
    if real == RealType.DOUBLE.c_name:
        return [
            Fault("--angles", "whole numbers of 32 bits hold no double", "choose --real float, or leave --angles out")
        ]
    return []


@dataclass(frozen=True, slots=True)
class Wanted:
    """An arm file that was read, and the options for its C."""

    file: ArmFile
    options: Options

    @property
    def source(self) -> Source:
        """What the C says of its origin: the file's name without its folder, so that the C is the same everywhere."""
        from codegen.emit.files import Source

        return Source(Path(self.file.path).name, self.file.digest)

    def generated(self) -> dict[str, str]:
        """{file name: text} of the C."""
        from codegen.pipeline import generate

        with working("deriving the inverse kinematics"):
            return generate(self.file.arm, self.options, self.source)


def wanted(arm: Path, real: str, math: str, prefix: str, angle_error: int, angles: str = "real") -> Wanted:
    """Checks the options and reads the arm file."""
    options = options_of(real, math, prefix, angle_error, angles)
    return Wanted(read(arm), options)


def read(path: Path) -> ArmFile:
    """The arm file; its warnings are shown."""
    from codegen.armfile import read_arm

    file = read_arm(path)
    show_faults("warning", file.warnings)
    return file
