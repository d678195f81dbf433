"""Measure the elementary functions of the generated C and write what is found: `python -m build_checks.certify`.

In float every number of a range is tried, against the library's double; in double a dense sample, against long double.
The figures go into `codegen/elementary/figures.py`, from where they come to stand beside the functions in the C.
"""

from __future__ import annotations

import struct
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import cffi

from build_checks.compile import find_compiler
from codegen.elementary import maths_context
from codegen.elementary.rows import BUDGETS, Figures, Worst
from codegen.emit.files import environment
from codegen.errors import CheckFailedError, Fault
from codegen.options import Arithmetic, Options, RealType

HARNESS = Path(__file__).with_name("certify.c")
FIGURES = Path(__file__).parents[1] / "codegen" / "elementary" / "figures.py"
FUNCTIONS = frozenset({"atan2", "sin_cos", "sqrt", "root", "exceeds", "abs", "is_finite"})
TURNS = 62832  # rad: 1e4 turns
_PREFIX = "own"
_DECLARATIONS = """
typedef struct { double error; double inputs[2]; } worst;
void scan_near(uint64_t, uint64_t, uint64_t, worst *, worst *);
void scan_far(uint64_t, uint64_t, uint64_t, worst *);
void scan_arc(uint64_t, uint64_t, uint64_t, worst *);
void scan_pairs(uint64_t, uint64_t, worst *);
uint64_t scan_roots(uint64_t, uint64_t, uint64_t);
uint64_t scan_software(uint64_t, uint64_t);
"""


@dataclass(frozen=True, slots=True)
class Scan:
    """How a number type is measured: the C around it, and how many numbers are skipped for each one tried."""

    real: RealType
    definitions: str
    packing: str
    stride: int
    far_stride: int
    pairs: int

    def word(self, value: float) -> int:
        """The bits of a number."""
        return int.from_bytes(struct.pack(f">{self.packing}", value), "big")


_FLOAT = """typedef double wide;
#define WIDE(function) function
#define OWN_LIBM(function) function##f
#define OWN_WORD uint32_t
enum { OWN_DIGITS = 24 };
"""
_DOUBLE = """#if LDBL_MANT_DIG < 64
#error "long double has too few digits here to measure double"
#endif
typedef long double wide;
#define WIDE(function) function##l
#define OWN_LIBM(function) function
#define OWN_WORD uint64_t
enum { OWN_DIGITS = 53 };
"""
SCANS = {  # strides are prime
    RealType.FLOAT: Scan(RealType.FLOAT, _FLOAT, "f", 1, 1, 10**8),
    RealType.DOUBLE: Scan(RealType.DOUBLE, _DOUBLE, "d", 152_587_890_621, 2_147_483_659, 10**7),
}


MEASURED = (
    (RealType.FLOAT, Arithmetic.REAL),
    (RealType.FLOAT, Arithmetic.INTEGER),
    (RealType.DOUBLE, Arithmetic.REAL),
)


def functions_text(options: Options, portable_root: bool = False) -> str:
    """The elementary functions alone, as one C file; `portable_root`: as where no processor has a square root."""
    context = maths_context(options)
    if portable_root:
        context = replace(context, roots=())
    uses = FUNCTIONS if context.own else FUNCTIONS - {"exceeds"}
    words = {"p": options.prefix, "P": options.prefix.upper(), "maths": context, "uses": uses}
    includes = "".join(f"#include {include}\n" for include in ("<stdbool.h>", *context.includes))
    p, real = options.prefix, options.real.c_name
    declared = f"typedef {real} {p}_real;\n{p}_real {p}_atan2({p}_real y, {p}_real x);\n\n"
    return includes + "\n" + declared + environment().get_template("maths.c.j2").render(words)


@contextmanager
def measuring(
    options: Options, portable_root: bool = False, defined: tuple[str, ...] = ()
) -> Iterator[tuple[Any, cffi.FFI]]:
    """The compiled functions with the harness behind them; `defined`: macros as another processor would have them."""
    scan = SCANS[options.real]
    text = functions_text(replace(options, prefix=_PREFIX), portable_root)
    ffi = cffi.FFI()
    ffi.cdef(_DECLARATIONS)
    with tempfile.TemporaryDirectory() as folder:
        source, library = Path(folder) / "own.c", Path(folder) / "own.so"
        source.write_text("#include <float.h>\n" + text + scan.definitions + HARNESS.read_text())
        flags = ["-std=c99", "-O2", "-ffp-contract=off", "-fno-builtin", "-fPIC", "-shared"]
        flags += [f"-D{macro}" for macro in defined]
        command = [find_compiler(), *flags, str(source), "-o", str(library), "-lm"]
        run = subprocess.run(command, capture_output=True, text=True, check=False)
        if run.returncode != 0:
            raise CheckFailedError(Fault("certify", f"the functions do not compile:\n{run.stderr}"))
        opened = ffi.dlopen(str(library))
        try:
            yield opened, ffi
        finally:
            ffi.dlclose(opened)


def measured(options: Options, sparser: int = 1) -> Figures:
    """The figures of one number type and budget; `sparser` times fewer numbers are tried."""
    scan = SCANS[options.real]
    eighth, most, one = scan.word(0.78539816), scan.word(TURNS), scan.word(1.0)
    stride, far_stride = scan.stride * sparser, scan.far_stride * sparser
    with measuring(options) as (library, ffi):
        sine, cosine, both, arc, pairs = (ffi.new("worst *") for _ in range(5))
        library.scan_near(0, eighth, stride, sine, cosine)
        library.scan_far(eighth, most, far_stride, both)
        library.scan_arc(0, one, stride, arc)
        library.scan_pairs(1, scan.pairs // sparser, pairs)
        return Figures(
            real=options.real,
            arithmetic=options.angles,
            budget=options.angle_error,
            sine=_worst(sine, 1),
            cosine=_worst(cosine, 1),
            sine_cosine=_worst(both, 1),
            arc=_worst(arc, 2),
            atan2=_worst(pairs, 2),
        )


def _worst(found: Any, inputs: int) -> Worst:
    return Worst(round(found.error, 6), tuple(found.inputs[i] for i in range(inputs)))


def errors_at(options: Options, figures: Figures) -> Figures:
    """The errors at the very inputs that the figures name."""
    scan = SCANS[options.real]
    with measuring(options) as (library, ffi):

        def near(inputs: tuple[float, ...]) -> tuple[Worst, Worst]:
            sine, cosine = ffi.new("worst *"), ffi.new("worst *")
            word = scan.word(inputs[0])
            library.scan_near(word, word, 1, sine, cosine)
            return _worst(sine, 1), _worst(cosine, 1)

        far, arc = ffi.new("worst *"), ffi.new("worst *")
        word = scan.word(figures.sine_cosine.inputs[0])
        library.scan_far(word, word, 1, far)
        word = scan.word(figures.arc.inputs[0])
        library.scan_arc(word, word, 1, arc)
        return replace(
            figures,
            sine=near(figures.sine.inputs)[0],
            cosine=near(figures.cosine.inputs)[1],
            sine_cosine=_worst(far, 1),
            arc=_worst(arc, 2),
        )


def wrong_roots(real: RealType, portable: bool, sparser: int = 1) -> int:
    """How many square roots of positive numbers are not the correctly rounded ones."""
    scan = SCANS[real]
    last = scan.word(float("inf")) - 1
    with measuring(Options(real=real), portable) as (library, _):
        return int(library.scan_roots(1, last, scan.stride * sparser))


def wrong_without_float_unit(count: int) -> int:
    """How many quotients and conversions differ that are made in whole numbers where a processor has no float unit."""
    options = Options(angles=Arithmetic.INTEGER)
    with measuring(options, defined=(f"{_PREFIX.upper()}_SOFTWARE_FLOAT",)) as (library, _):
        return int(library.scan_software(1, count))


def figures_text(rows: list[Figures]) -> str:
    """The module that holds the figures."""
    lines = [
        '"""Measured errors. Written by `python -m build_checks.certify`: do not edit."""',
        "",
        "from codegen.elementary.rows import Figures, Worst",
        "from codegen.options import Arithmetic, RealType",
        "",
        "FIGURES: tuple[Figures, ...] = (",
        *(line for row in rows for line in _figure_lines(row)),
        ")",
    ]
    return "\n".join(lines) + "\n"


def _figure_lines(row: Figures) -> list[str]:
    names = ("sine", "cosine", "sine_cosine", "arc", "atan2")
    figures: list[tuple[str, Worst]] = [(name, getattr(row, name)) for name in names]
    inner = [f"        {name}=Worst({worst.error!r}, {worst.inputs!r})," for name, worst in figures]
    return [
        "    Figures(",
        f"        real=RealType.{row.real.name},",
        f"        arithmetic=Arithmetic.{row.arithmetic.name},",
        f"        budget={row.budget},",
        *inner,
        "    ),",
    ]


def main() -> None:
    rows = []
    for real, angles in MEASURED:
        for budget in BUDGETS:
            rows.append(measured(Options(real=real, angle_error=budget, angles=angles)))
            sys.stdout.write(f"{rows[-1]}\n")
            sys.stdout.flush()
    FIGURES.write_text(figures_text(rows), encoding="utf-8")


if __name__ == "__main__":
    main()
