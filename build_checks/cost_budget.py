"""`--budget cycles=...,flash=...,stack=...`: the most that the C may cost on every target measured."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from build_checks.cost import CostReport, TargetCost
from codegen.errors import CallError, Fault


@dataclass(frozen=True, slots=True)
class Quantity:
    """What a budget can bound: its name on the command line, what it means, and how a target answers it."""

    name: str
    meaning: str
    of: Callable[[TargetCost], int]


QUANTITIES = (
    Quantity("cycles", "worst cycles of any one function, at -O2", lambda cost: cost.cycles),
    Quantity("flash", "bytes of all functions together, at -O2", lambda cost: cost.flash),
    Quantity("stack", "worst bytes of stack of any one function, at -O2", lambda cost: cost.stack),
)


@dataclass(frozen=True, slots=True)
class Bound:
    quantity: Quantity
    most: int


@dataclass(frozen=True, slots=True)
class Excess:
    """A bound that a target exceeds."""

    target: str
    quantity: str
    found: int
    most: int

    def __str__(self) -> str:
        return f"{self.target}: {self.quantity} {self.found} exceeds the budget of {self.most}"


def parse_budget(text: str) -> tuple[Bound, ...]:
    """Reads what follows --budget; CallError lists every part that is wrong."""
    parts = [part.strip() for part in text.split(",")]
    faults = [fault for fault in map(_fault, parts) if fault]
    names = [part.partition("=")[0].strip() for part in parts]
    faults += [_said_twice(name) for name in sorted(set(names)) if names.count(name) > 1]
    if faults:
        raise CallError(*faults)
    return tuple(_bound(part) for part in parts)


def _fault(part: str) -> Fault | None:
    name, equals, value = (piece.strip() for piece in part.partition("="))
    known = ", ".join(sorted(quantity.name for quantity in QUANTITIES))
    if name not in [quantity.name for quantity in QUANTITIES] or not equals:
        return Fault("--budget", f'cannot read "{part}"', hint=f"name=number, name one of: {known}")
    if not (value.isascii() and value.isdigit() and int(value) > 0):
        return Fault(
            "--budget", f'{name}: "{value}" is no whole number above 0', hint="cycles, or bytes, without a unit"
        )
    return None


def _said_twice(name: str) -> Fault:
    return Fault("--budget", f'"{name}" is given more than once', hint="give each bound once")


def _bound(part: str) -> Bound:
    name, _, value = (piece.strip() for piece in part.partition("="))
    return Bound(next(quantity for quantity in QUANTITIES if quantity.name == name), int(value))


def exceeded(report: CostReport, budget: tuple[Bound, ...]) -> tuple[Excess, ...]:
    """Every bound that a measured target exceeds, in the order of the report."""
    return tuple(
        Excess(cost.target, bound.quantity.name, bound.quantity.of(cost), bound.most)
        for cost in report.targets
        for bound in budget
        if bound.quantity.of(cost) > bound.most
    )
