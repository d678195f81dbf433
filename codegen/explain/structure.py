"""What is special in a chain, in words: how neighbouring axes lie, which groups of axes meet or are parallel.

Read off the link table to 60 digits, whatever the derivation makes of it.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from codegen.chain import Chain, chain_of
from codegen.exact import MP, Real
from codegen.geometry import Rigid, Space
from codegen.inverse.groups import common_normal, spherical
from codegen.inverse.oracle import Oracle
from codegen.inverse.segment import Core, Segment, Use
from codegen.inverse.solver import Solver
from codegen.model import Arm
from codegen.program import Builder

_NOTHING = MP.mpf(10) ** -35


class Lie(Enum):
    """How the axes of two neighbouring joints lie; a slide has a direction only."""

    SAME = "on one line"
    PARALLEL = "parallel"
    MEETING = "meeting"
    SKEW = "apart"
    ALONG = "the same direction"
    ACROSS = "different directions"


@dataclass(frozen=True, slots=True)
class Neighbours:
    """Joints `first` and `first + 1`.

    angle     between the axes as lines, rad, 0 to pi/2
    distance  between them, m; 0 where a slide has none
    """

    first: int
    lie: Lie
    angle: Real
    distance: Real


@dataclass(frozen=True, slots=True)
class Structure:
    """What decides the shape of the formulas.

    meeting, parallel  groups of three and more neighbouring joints, positions from 0
    """

    neighbours: tuple[Neighbours, ...]
    meeting: tuple[tuple[int, ...], ...]
    parallel: tuple[tuple[int, ...], ...]


def structure_of(arm: Arm) -> Structure:
    builder = Builder()
    space = Space(builder)
    chain = chain_of(arm, builder)
    solver = Solver(builder, space, Oracle(), len(arm.joints))
    segment = Segment(tuple(Use(joint) for joint in chain.joints), _cores(space, chain))
    neighbours = tuple(_neighbours(chain, k) for k in range(len(chain.joints) - 1))
    triples = range(len(chain.joints) - 2)
    meeting = tuple((k, k + 1, k + 2) for k in triples if spherical(solver, segment.part(k, 3)) is not None)
    return Structure(neighbours, meeting, _parallel_runs(solver, segment))


def _cores(space: Space, chain: Chain) -> tuple[Core, ...]:
    behind = chain.joints[1:]
    return tuple(Core(space.zero, core, joint.slide) for core, joint in zip(chain.cores[1:-1], behind, strict=True))


def _parallel_runs(solver: Solver, segment: Segment) -> tuple[tuple[int, ...], ...]:
    """The longest runs of neighbouring joints of which three or more turn, all about parallel axes."""
    runs: list[tuple[int, ...]] = []
    count = len(segment.uses)
    for first in range(count):
        for length in range(count - first, 2, -1):
            run = tuple(range(first, first + length))
            ends_turn = segment.uses[run[0]].turns and segment.uses[run[-1]].turns
            turning = sum(segment.uses[k].turns for k in run)
            inside = any(set(run) <= set(other) for other in runs)
            if ends_turn and turning >= 3 and not inside and common_normal(solver, segment.part(first, length)):
                runs.append(run)
    return tuple(runs)


def _neighbours(chain: Chain, first: int) -> Neighbours:
    core = chain.cores[first + 1]
    x, y, z = (MP.mpf(row[2].value) for row in core.rotation)
    sine = MP.sqrt(x**2 + y**2)
    angle = MP.atan2(sine, abs(z))
    parallel = sine < _NOTHING
    if not (chain.joints[first].turns and chain.joints[first + 1].turns):
        return Neighbours(first, Lie.ALONG if parallel else Lie.ACROSS, angle, MP.mpf(0))
    distance = _distance(core, x, y, sine, parallel)
    if distance < _NOTHING:
        return Neighbours(first, Lie.SAME if parallel else Lie.MEETING, angle, MP.mpf(0))
    return Neighbours(first, Lie.PARALLEL if parallel else Lie.SKEW, angle, distance)


def _distance(core: Rigid, x: Real, y: Real, sine: Real, parallel: bool) -> Real:
    """Of the axis that comes behind a core from the z axis before it."""
    t = [MP.mpf(entry.value) for entry in core.shift]
    return MP.sqrt(t[0] ** 2 + t[1] ** 2) if parallel else abs(t[1] * x - t[0] * y) / sine
