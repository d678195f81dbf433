"""What a page shows beside what follows from the arm alone: plain values, whoever measured them."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Table:
    """Texts ready to show; columns in `left` stand flush left, all others flush right."""

    caption: str
    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    left: tuple[int, ...] = (0,)


@dataclass(frozen=True, slots=True)
class Agreement:
    """What the check of the C found.

    verdict  one sentence
    remarks  sentences below the tables
    failure  the first failing case, whole; empty where everything agreed
    """

    agreed: bool
    verdict: str
    tables: tuple[Table, ...]
    remarks: tuple[str, ...] = ()
    failure: str = ""


@dataclass(frozen=True, slots=True)
class ErrorMap:
    """The largest error in each cell of a section of the workspace.

    values  [row][column], row 0 lowest; None where no sampled pose lies
    unit    of the values
    right, up              cell edges along the two directions, in `length_unit`
    right_label, up_label  what the two directions are
    """

    title: str
    note: str
    unit: str
    values: tuple[tuple[float | None, ...], ...]
    right: tuple[float, ...]
    up: tuple[float, ...]
    right_label: str
    up_label: str
    length_unit: str


@dataclass(frozen=True, slots=True)
class Vector:
    """What the C gives in doubles: the pose at `joints`, and every branch of that pose from `seed`. SI units.

    pose      the rotation row by row, then the position
    branches  None where there is no solution
    """

    joints: tuple[float, ...]
    seed: tuple[float, ...]
    pose: tuple[float, ...]
    statuses: tuple[int, ...]
    branches: tuple[tuple[float, ...] | None, ...]


@dataclass(frozen=True, slots=True)
class Measured:
    """All that was measured: `costs` are tables, `cost_remarks` what could not be measured and why."""

    agreement: Agreement
    vectors: tuple[Vector, ...]
    maps: tuple[ErrorMap, ...]
    costs: tuple[Table, ...] = ()
    cost_remarks: tuple[str, ...] = ()
