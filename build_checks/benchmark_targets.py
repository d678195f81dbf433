"""Compare the generated C with hand-written C on every target, in one run: python -m build_checks.benchmark_targets

Both are compiled with the same compiler and flags, called at the same poses with the same seeds, and measured in the
same emulator; on m3, m0plus and rv32 the generated C is that of --angles integer. Each cell is generated / hand-written,
then their ratio.
"""

from __future__ import annotations

import argparse
import shutil
import subprocess
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from build_checks.benchmark_peers import PEER_PREFIX, PEERS, Peer, peer_files
from build_checks.cost import CostReport, TargetCost, measure_cost
from build_checks.reference import Reference
from build_checks.targets import AVR, TARGETS, target_named
from codegen.armfile import read_arm
from codegen.options import Arithmetic, Options

_ARMS = Path(__file__).parents[1] / "arms"
_SEED = 20240501
_FUNCTIONS = ("forward", "inverse", "inverse_all")


@dataclass(frozen=True, slots=True)
class Ratio:
    """One figure of one arm on one target, generated against hand-written."""

    arm: str
    target: str
    figure: str
    generated: float
    by_hand: float

    @property
    def ratio(self) -> float:
        return self.generated / self.by_hand


def compare(peer: Peer, target_names: Sequence[str], poses: int) -> tuple[list[Ratio], tuple[str, ...]]:
    """Every figure of one arm, and the targets that cannot be measured here."""
    from codegen.pipeline import generate  # not needed to measure the hand-written code alone

    arm = read_arm(_ARMS / f"{peer.arm}.toml").arm
    joints = Reference(arm).random_joints(np.random.default_rng(_SEED), poses).tolist()
    names = target_names or [target.name for target in TARGETS]
    measured = [measure_cost(generate(arm, options_for(name)), options_for(name), [name], joints) for name in names]
    generated = replace(measured[0], targets=tuple(target for report in measured for target in report.targets))
    by_hand = measure_cost(peer_files(peer), Options(prefix=PEER_PREFIX), target_names, joints, libm=True)
    return list(_ratios(peer.arm, generated, by_hand)), by_hand.not_measured


def options_for(target_name: str) -> Options:
    """Angles in whole numbers where the processor has no float unit but multiplies 32 bits quickly."""
    target = target_named(target_name)
    quicker = "float" not in target.hard_reals and target is not AVR
    return Options(angles=Arithmetic.INTEGER if quicker else Arithmetic.REAL)


def _ratios(arm: str, generated: CostReport, by_hand: CostReport) -> Iterator[Ratio]:
    for ours, theirs in zip(generated.targets, by_hand.targets, strict=True):
        for figure, value, other in _figures(ours, theirs):
            yield Ratio(arm, ours.target, figure, value, other)


def _figures(ours: TargetCost, theirs: TargetCost) -> Iterator[tuple[str, float, float]]:
    for name in _FUNCTIONS:
        yield f"{name}, cycles", ours.function(name).cycles.mean, theirs.function(name).cycles.mean
        yield f"{name}, instructions", ours.function(name).instructions.mean, theirs.function(name).instructions.mean
    yield "flash of the three at -O2", ours.core_flash, theirs.core_flash
    yield "flash of the three at -Os", ours.core_flash_small, theirs.core_flash_small
    yield "stack, painted", _painted(ours), _painted(theirs)


def _painted(cost: TargetCost) -> int:
    return max(cost.function(name).stack_painted for name in _FUNCTIONS)


def ratio_table(ratios: Sequence[Ratio]) -> str:
    """A Markdown table: a row for each figure, a column for each target."""
    targets = list(dict.fromkeys(ratio.target for ratio in ratios))
    figures = list(dict.fromkeys(ratio.figure for ratio in ratios))
    cells = {(ratio.figure, ratio.target): _cell(ratio) for ratio in ratios}
    head = [f"| figure | {' | '.join(targets)} |", f"| --- |{' ---: |' * len(targets)}"]
    rows = [f"| {figure} | {' | '.join(cells[figure, target] for target in targets)} |" for figure in figures]
    return "\n".join([*head, *rows])


def _cell(ratio: Ratio) -> str:
    return f"{ratio.generated:.0f} / {ratio.by_hand:.0f} = {ratio.ratio:.2f}"


def tool_versions() -> list[str]:
    """First line of --version of every compiler used."""
    compilers = sorted({f"{target.toolchain}gcc" for target in TARGETS})
    return [_first_line([compiler, "--version"]) for compiler in compilers if shutil.which(compiler)]


def _first_line(command: list[str]) -> str:
    return subprocess.run(command, capture_output=True, text=True, check=True).stdout.splitlines()[0]


def main(arguments: Sequence[str] | None = None) -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--target", action="append", default=[], help="measure this target only; may be repeated")
    parser.add_argument("--arm", action="append", default=[], help="measure this arm only; may be repeated")
    parser.add_argument("--poses", type=int, default=200)
    chosen = parser.parse_args(arguments)
    targets = [target_named(name).name for name in chosen.target]
    print(f"{chosen.poses} poses, seed {_SEED}; generated / hand-written = ratio", *tool_versions(), sep="\n")
    for peer in PEERS:
        if not chosen.arm or peer.arm in chosen.arm:
            ratios, not_measured = compare(peer, targets, chosen.poses)
            print(f"\n{peer.arm}: {peer.what}\n", ratio_table(ratios), *not_measured, sep="\n")


if __name__ == "__main__":
    main()
