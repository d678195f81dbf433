"""Which joint an arm is swept by, how finely, and what share of all solutions that finds.

Every pair of neighbouring axes that meet or are parallel, with every other joint as the swept one, is a way to sweep. They
find nearly the same solutions, but their branches end more or less often, and near the end of a branch solutions are
easier overlooked: so the ways are tried on random poses, and the cheapest of those that miss least is taken. Fresh poses
then give the share that the header states.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from codegen.inverse.plan import SlideStep
from codegen.inverse.sweep import Sweep, sweeps
from codegen.model import Arm
from codegen.tracking.placing import Placing
from codegen.tracking.search import Search
from codegen.tracking.shape import shape_of
from codegen.tracking.trial import Trial
from codegen.tracking.walking import Walk

COARSE = 32  # samples of one branch, by which ways are compared: so few tell them apart
SAMPLES = (64, 128)  # the fewer of these if they miss nothing, and twice as many of them to be sure
MOST_SAMPLES = 512
MOST_BRANCHES = 8
_STEP_COST = 8  # samples that cost as much as one step


@dataclass(frozen=True, slots=True)
class SweepEffort:
    """How much is searched: numbers of poses and of starts for each."""

    seed: int = 2
    choosing_poses: int = 40
    choosing_starts: int = 300
    measuring_poses: int = 200
    dense_starts: int = 500


@dataclass(frozen=True, slots=True)
class Swept:
    """How an arm is swept, and what that finds against a dense search over random reachable poses.

    poses, solutions         searched, and found by the dense search and the sweep together
    found                    of them found by the sweep
    mean_steps, mean_placed  steps from all launches of one pose, and samples
    most_launches            of one pose, as far as was seen
    most_found               solutions of one pose
    """

    sweep: Sweep = field(repr=False)
    samples: int
    poses: int
    solutions: int
    found: int
    mean_steps: int
    mean_placed: int
    most_launches: int
    most_found: int

    @property
    def share(self) -> float:
        return self.found / self.solutions if self.solutions else 1.0


@dataclass(frozen=True, slots=True)
class _Tried:
    missed: int
    cost: int
    steps: int
    placed: int
    solutions: int
    launches: int
    most_found: int

    @property
    def order(self) -> tuple[int, int]:
        return self.missed, self.cost


def prepare_sweep(arm: Arm, effort: SweepEffort = SweepEffort()) -> Swept | None:
    """None where no joint can be swept with the others in closed form without a quartic."""
    ways = [sweep for sweep in sweeps(arm) if _is_light(sweep)]
    if not ways:
        return None
    shape = shape_of(arm)
    search = Search(arm, shape, effort.seed)
    trial = Trial(search, effort.choosing_poses, effort.choosing_starts)
    reach = float(shape.reach)
    tried = [_try(trial, Placing(sweep, reach), COARSE) for sweep in ways]
    best = min(range(len(ways)), key=lambda k: (tried[k].order, k))
    placing = Placing(ways[best], reach)
    samples = 2 * (SAMPLES[0] if not _try(trial, placing, SAMPLES[0]).missed else SAMPLES[1])
    measured = _try(Trial(search, effort.measuring_poses, effort.dense_starts), placing, samples)
    while measured.missed and samples < MOST_SAMPLES:
        samples *= 2  # and measured on other poses
        measured = _try(Trial(search, effort.measuring_poses, effort.dense_starts), placing, samples)
    return Swept(
        ways[best],
        samples,
        effort.measuring_poses,
        measured.solutions,
        measured.solutions - measured.missed,
        measured.steps // effort.measuring_poses,
        measured.placed // effort.measuring_poses,
        measured.launches,
        measured.most_found,
    )


def _is_light(sweep: Sweep) -> bool:
    """Few branches, no quartic, no slide that may be divided by zero."""
    steps = sweep.plan.steps
    sure = all(step.denominator.is_constant for step in steps if isinstance(step, SlideStep))
    return sure and sweep.plan.branches <= MOST_BRANCHES and all(step.roots <= 2 for step in steps)


def _try(trial: Trial, placing: Placing, samples: int) -> _Tried:
    launches = Walk(placing, trial.target, trial.joints, samples).launches()
    outcome = trial.outcome(launches)
    return _Tried(
        outcome.missed,
        outcome.steps * _STEP_COST + launches.placed,
        outcome.steps,
        launches.placed,
        outcome.solutions,
        launches.most(trial.poses),
        outcome.most,
    )
