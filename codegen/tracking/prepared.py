"""What is prepared for an arm without a closed form: a sweep where one can be made, else a table of starts."""

from __future__ import annotations

from functools import cache

from codegen.model import Arm
from codegen.tracking.shape import shape_of
from codegen.tracking.starts import Measured, TrackingTables, most_solutions, prepare_starts
from codegen.tracking.sweeping import Swept, prepare_sweep

_SURE = 0.999  # a sweep that finds this share of all solutions is taken without a look at what a table would find


@cache
def prepared(arm: Arm) -> TrackingTables:
    """Whichever finds the larger share; takes some seconds, so it is made once."""
    swept = prepare_sweep(arm)
    if swept is not None and swept.share >= _SURE:
        return _by_sweep(arm, swept)
    tables = prepare_starts(arm)
    if swept is not None and swept.share > tables.measured.share:
        return _by_sweep(arm, swept)
    return tables


def _by_sweep(arm: Arm, swept: Swept) -> TrackingTables:
    shape = shape_of(arm)
    branches, proven = most_solutions(shape, swept.most_found)
    measured = Measured(swept.poses, swept.solutions, swept.found, swept.mean_steps)
    return TrackingTables(shape, (), (), swept.most_found, branches, proven, measured, swept)
