"""What the template of the elementary functions needs, as text that is ready to place."""

from __future__ import annotations

from dataclasses import dataclass

from mpmath import mp

from codegen.elementary.printed import FixedPolynomial, Polynomial, Printed, fixed_polynomial, polynomial, printed
from codegen.elementary.roots import RootInstruction, root_instructions
from codegen.elementary.table import figures_for, integer_row_for, row_for
from codegen.elementary.words import Layout, layout_of
from codegen.elementary.worst import WorstTexts, worst_texts
from codegen.errors import CallError, Fault
from codegen.options import Arithmetic, Mathematics, Options, RealType

_NEAR = {RealType.FLOAT: 32, RealType.DOUBLE: 65536}  # rad; the number of quarters fits beside the bits below
_SOFTWARE = {
    RealType.FLOAT: "defined(__AVR__) || (defined(__arm__) && !defined(__ARM_FP)) || "
    "(defined(__riscv) && !defined(__riscv_flen))",
    RealType.DOUBLE: "(defined(__arm__) && (!defined(__ARM_FP) || ((__ARM_FP & 8) == 0))) || "
    "(defined(__riscv) && (!defined(__riscv_flen) || (__riscv_flen < 64)))",
}
_SPLITS = {RealType.FLOAT: (19,), RealType.DOUBLE: (36, 36)}  # bits of all but the last part of pi/2


@dataclass(frozen=True, slots=True)
class FixedFunctions:
    """The polynomials of sine, cosine and arc tangent in whole numbers."""

    sine: FixedPolynomial
    cosine: FixedPolynomial
    arc: FixedPolynomial


@dataclass(frozen=True, slots=True)
class MathsContext:
    """Everything that `maths.c.j2` places.

    own          False: the functions call libm
    software     the preprocessor's condition that numbers of the type are computed by calls
    fixed        sine, cosine and atan2 in whole numbers; None: in the number type
    single       the type is float
    suffix       of the libm functions' names; literal_suffix of the numbers
    includes     the standard headers that the functions need; they go to the top of the file
    quarter      pi/2 in parts: a part times any number of quarters met is exact, but for the last
    turn         2 pi in parts, likewise
    shift        adding it rounds to a whole number, which then stands in the low bits of the sum
    near         bits of the largest angle that is reduced in one step, and that angle for the comment
    """

    own: bool
    software: str
    fixed: FixedFunctions | None
    single: bool
    real: str
    suffix: str
    literal_suffix: str
    includes: tuple[str, ...]
    layout: Layout
    sine: Polynomial
    cosine: Polynomial
    arc: Polynomial
    quarter: tuple[Printed, ...]
    turn: tuple[Printed, ...]
    quarters_per_radian: Printed
    turns_per_radian: Printed
    shift: Printed
    near: Printed
    near_text: str
    quarter_pi: Printed
    half_pi: Printed
    three_quarters_pi: Printed
    pi: Printed
    turn_unit: Printed
    upscale: Printed
    square_scale: Printed
    square_scale_bits: int
    libm_sqrt: str
    roots: tuple[RootInstruction, ...]
    worst: WorstTexts | None


def maths_context(options: Options) -> MathsContext:
    """The elementary functions for the options. Nothing is fitted here: coefficients come from the stored table.

    Raises CallError for an angle error that no row meets, or for whole numbers asked for with another type than float.
    """
    real, own = options.real, options.mathematics is Mathematics.OWN
    row = row_for(real, options.angle_error)
    figures = figures_for(options) if own else None

    def number(value: object) -> Printed:
        return printed(float(mp.mpf(value)), real)

    single = real is RealType.FLOAT
    with mp.workdps(40):
        return MathsContext(
            own=own,
            software=_SOFTWARE[real],
            fixed=_fixed_functions(options) if own and options.angles is Arithmetic.INTEGER else None,
            single=single,
            real=real.c_name,
            suffix=real.libm_suffix,
            literal_suffix=real.suffix,
            includes=("<float.h>", "<stdint.h>") if own else ("<math.h>", "<stdint.h>"),
            layout=layout_of(real),
            sine=polynomial("s", row.sine, real),
            cosine=polynomial("c", row.cosine, real),
            arc=polynomial("a", row.arc, real),
            quarter=tuple(map(number, _parts_of_quarter(real))),
            turn=tuple(number(4 * part) for part in _parts_of_quarter(real)),
            quarters_per_radian=number(2 / mp.pi),
            turns_per_radian=number(1 / (2 * mp.pi)),
            shift=number(3 * 2 ** (real.bits - 2)),
            near=number(_NEAR[real]),
            near_text=str(_NEAR[real]),
            quarter_pi=number(mp.pi / 4),
            half_pi=number(mp.pi / 2),
            three_quarters_pi=number(3 * mp.pi / 4),
            pi=number(mp.pi),
            turn_unit=number(mp.mpf(2) ** -30),
            upscale=number(2 ** (real.bits + 1)),
            square_scale=number(2 ** (2 * real.bits)),
            square_scale_bits=2 * real.bits,
            libm_sqrt=f"sqrt{real.libm_suffix}",
            roots=root_instructions(real),
            worst=worst_texts(figures, real) if figures else None,
        )


def _parts_of_quarter(real: RealType) -> list[float]:
    """pi/2 as a sum of short numbers: each has few enough bits that its products with whole numbers are exact."""
    with mp.workdps(80):
        rest, parts = mp.pi / 2, []
        for bits in _SPLITS[real]:
            unit = mp.mpf(2) ** (mp.floor(mp.log(rest, 2)) + 1 - bits)
            parts.append(float(mp.floor(rest / unit) * unit))
            rest -= parts[-1]
        return [*parts, float(rest)]


def _fixed_functions(options: Options) -> FixedFunctions:
    if options.real is not RealType.FLOAT:
        what = f"angles in whole numbers are there for float only, not for {options.real.c_name}"
        raise CallError(Fault("--angles", what, hint="generate with --real float, or with --angles real"))
    row, function = integer_row_for(options.angle_error), f"{options.prefix}_high_add"
    return FixedFunctions(
        sine=fixed_polynomial("s", row.sine, 34, 2, function),
        cosine=fixed_polynomial("c", row.cosine, 32, 2, function),
        arc=fixed_polynomial("a", row.arc, 30, 1, function),
    )
