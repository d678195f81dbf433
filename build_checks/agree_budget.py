"""The errors that the accuracy promise allows.

A position within `share` of the reach and a rotation within `angle`, for float and for double; at singular poses and
at the edge of the reach twice that. Code whose own sine, cosine and arc tangent were asked for with a looser error is
allowed what these add: each joint's pair and its returned angle, errors counted in units in the last place.
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.options import Mathematics, Options, RealType

_EXACT_ULPS = 2  # the default error of the own functions; the promise holds with it
_UNITS_PER_ULP = 5  # of the number type, per joint: 1 of a cosine or sine, 4 of an angle up to pi


@dataclass(frozen=True, slots=True)
class Budget:
    """Errors allowed: `share` of the reach, `angle` in radians, `ulps` of atan2; `unit` is half the last place of 1."""

    share: float
    angle: float
    ulps: int
    unit: float

    @property
    def task(self) -> float:
        """Both together, metres counted in reaches."""
        return self.share + self.angle


_PROMISED = {RealType.FLOAT: (1e-6, 2e-6), RealType.DOUBLE: (1e-14, 2e-14)}


def budget_of(options: Options, joints: int) -> Budget:
    """What C generated with these options is allowed."""
    share, angle = _PROMISED[options.real]
    unit = float(options.real.rounding)
    ulps = options.angle_error if options.mathematics is Mathematics.OWN else _EXACT_ULPS
    looser = _UNITS_PER_ULP * joints * unit * max(0, ulps - _EXACT_ULPS)
    return Budget(share + looser, angle + looser, ulps, unit)
