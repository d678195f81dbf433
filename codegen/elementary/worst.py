"""Measured errors as the sentences that stand beside the functions in the C."""

from __future__ import annotations

import math
from dataclasses import dataclass

from codegen.elementary.printed import printed
from codegen.elementary.rows import Figures, Worst
from codegen.options import RealType


@dataclass(frozen=True, slots=True)
class WorstTexts:
    """For example "0.55 ulp, at 0.78539f"; `over` says over which numbers."""

    sine: str
    cosine: str
    sine_cosine: str
    arc: str
    atan2: str
    over: str


def worst_texts(figures: Figures, real: RealType) -> WorstTexts:
    """The figures of one row, rounded up."""
    return WorstTexts(
        sine=_text(figures.sine, real),
        cosine=_text(figures.cosine, real),
        sine_cosine=_text(figures.sine_cosine, real),
        arc=_text(figures.arc, real),
        atan2=_text(figures.atan2, real),
        over="every number" if real is RealType.FLOAT else "a dense sample of numbers",
    )


def _text(worst: Worst, real: RealType) -> str:
    places = 2 if worst.error < 100 else 0
    rounded = math.ceil(worst.error * 10**places) / 10**places
    inputs = ", ".join(printed(value, real).text for value in worst.inputs)
    return f"{rounded:.{places}f} ulp, at {inputs if len(worst.inputs) == 1 else f'({inputs})'}"
