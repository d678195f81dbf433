"""The sweep as text that is ready to place into `tracking_sweep.c.j2`."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.emit.expression import Constants
from codegen.emit.numbers import literal
from codegen.exact import MP, Real
from codegen.options import Options
from codegen.tracking import beside, walking
from codegen.tracking.placing_text import PlacingText, placing_text
from codegen.tracking.sweeping import Swept


@dataclass(frozen=True, slots=True)
class SweepContext:
    """Every string and number that the template of the sweep places.

    swept       the joint, by its name
    numbers     (name, literal, comment) of constants
    place       the function that fills a sample
    most_spare  as much as there can be under a root, against what it is made of
    """

    swept: str
    branches: int
    samples: int
    closing_steps: int
    valley_steps: int
    fold_steps: int
    fold_samples: int
    launches: int
    numbers: tuple[tuple[str, str, str], ...]
    place: PlacingText
    most_spare: str


def sweep_context(swept: Swept, options: Options, constants: Constants) -> SweepContext:
    return SweepContext(
        swept=swept.sweep.label,
        branches=swept.sweep.plan.branches,
        samples=swept.samples,
        closing_steps=walking.CLOSING_STEPS,
        valley_steps=walking.VALLEY_STEPS,
        fold_steps=walking.FOLD_STEPS,
        fold_samples=walking.FOLD_SAMPLES,
        launches=walking.MOST_LAUNCHES,
        numbers=_numbers(swept, options),
        place=placing_text(swept.sweep, options, constants),
        most_spare=literal(1, options.real),
    )


def _numbers(swept: Swept, options: Options) -> tuple[tuple[str, str, str], ...]:
    rows: list[tuple[str, Real | Fraction, str]] = [
        ("SAMPLE_STEP", 2 * MP.pi / swept.samples, "rad"),
        (
            "LEAST_SHARE",
            Fraction(str(walking.LEAST_SHARE)),
            "of the way between two places that a closing step takes off",
        ),
        ("FOLD_SHARE", Fraction(1, walking.FOLD_SAMPLES), "of the root that vanishes at the end of a branch"),
        ("NARROW", Fraction(str(walking.NARROW)), "what may be left under a root where a branch nearly ends"),
        (
            "TOUCHING",
            Fraction(str(beside.TOUCHING)) ** 2,
            "squared length of a column where two solutions may be about to meet",
        ),
        ("BESIDE", Fraction(str(beside.BESIDE)), "of an unknown: how far beside a solution another is looked for from"),
    ]
    return tuple((name, literal(value, options.real), comment) for name, value, comment in rows)
