"""What is kept of one fit, and of one measurement: the types of the two generated tables beside this module."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.options import Arithmetic, RealType

BUDGETS = (2, 16, 256, 4096)  # ulp: largest error of sine, cosine and arc tangent that a row may have


@dataclass(frozen=True, slots=True)
class Row:
    """Fitted coefficients of one number type and budget, lowest power first.

    sine    sin r = r + r z (s1 + z (s2 + ...)), z = r^2, |r| <= pi/4
    cosine  cos r = 1 + z (c1 + z (c2 + ...))
    arc     arctan q = q + q z (a1 + z (a2 + ...)), z = q^2, |q| <= 9/16
    """

    real: RealType
    budget: int
    sine: tuple[float, ...]
    cosine: tuple[float, ...]
    arc: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class IntegerRow:
    """Fitted coefficients of float for whole numbers of 32 bits, lowest power first; z is a Q30 (arc: Q31) square.

    sine    sin r / r - 1 = z (s1 + z (s2 + ...)), z = (r / (pi/4))^2; s1 is Q34, s2 Q36, ...
    cosine  cos r - 1     = z (c1 + z (c2 + ...)), likewise; c1 is Q32, c2 Q34, ...
    arc     arctan q / q - 1 = z (a1 + z (a2 + ...)), z = q^2, q <= 1; a1 is Q30, a2 Q31, ...
    """

    budget: int
    sine: tuple[int, ...]
    cosine: tuple[int, ...]
    arc: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Worst:
    """The largest error found, and what reaches it.

    error   in ulp, the distance of neighbouring numbers at the true result; for `sine_cosine` the ulp just below 1
    inputs  the arguments, in the order of the C function's
    """

    error: float
    inputs: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Figures:
    """Measured errors of the generated C with one row; `arithmetic` is what it computes angles in.

    sine, cosine  every number with |angle| <= pi/4 (double: a dense sample)
    sine_cosine   both functions, every number up to 1e4 turns (double: a sample)
    arc           atan2 with x = 1, every y in [0, 1] (double: a dense sample)
    atan2         atan2 over a large sample of pairs
    """

    real: RealType
    arithmetic: Arithmetic
    budget: int
    sine: Worst
    cosine: Worst
    sine_cosine: Worst
    arc: Worst
    atan2: Worst
