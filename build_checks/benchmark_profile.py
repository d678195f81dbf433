"""Where the cycles go, by function: python -m build_checks.benchmark_profile bench_six --target m4f --function inverse

For whoever makes the generated C faster: cycles spent in each function itself, per call, of the generated C and of the
hand-written C side by side. Arm and RISC-V targets only: the AVR simulator counts cycles without saying where.
"""

from __future__ import annotations

import argparse
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np

from build_checks.benchmark_peers import PEER_PREFIX, PEERS, peer_files
from build_checks.benchmark_targets import options_for
from build_checks.cost_calls import cost_calls
from build_checks.emulate import make_calls
from build_checks.emulate_contract import FUNCTIONS, TargetInterface, read_interface
from build_checks.emulate_image import compile_objects, link_image
from build_checks.emulate_unicorn import UnicornMachine
from build_checks.reference import Reference
from build_checks.targets import AVR, TARGETS, Target, target_named
from codegen.armfile import read_arm
from codegen.options import Options
from codegen.pipeline import generate

_ARMS = Path(__file__).parents[1] / "arms"
_SEED = 20240501


def profile(
    files: Mapping[str, str], prefix: str, target: Target, function: str, joints: list[list[float]], *, libm: bool
) -> dict[str, float]:
    """Cycles of one call on average, by the function that spends them, the costliest first."""
    interface = read_interface(files, prefix)
    calls = cost_calls(files, interface, joints, libm).on(TargetInterface(interface, target))[function]
    with tempfile.TemporaryDirectory() as folder:
        objects = compile_objects(target, files, Path(folder), libm=libm)
        machine = UnicornMachine(link_image(objects, [f"{prefix}_{function}"], "profiled", libm=libm))
        made = len(list(make_calls(machine, calls, count=True)))
        return {name: cycles / made for name, cycles in machine.cycles_by_function.most_common()}


def _show(title: str, cycles: Mapping[str, float]) -> None:
    print(f"\n{title}: {sum(cycles.values()):.0f} cycles a call")
    for name, spent in cycles.items():
        print(f"  {spent:8.0f}  {name}")


def main(arguments: Sequence[str] | None = None) -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("arm", help="the name of an arm file in arms/, without .toml")
    parser.add_argument("--target", default="m4f", choices=[target.name for target in TARGETS if target is not AVR])
    parser.add_argument("--function", default="inverse", choices=FUNCTIONS)
    parser.add_argument("--poses", type=int, default=50)
    chosen = parser.parse_args(arguments)
    arm, target = read_arm(_ARMS / f"{chosen.arm}.toml").arm, target_named(chosen.target)
    joints = Reference(arm).random_joints(np.random.default_rng(_SEED), chosen.poses).tolist()
    ours = generate(arm, options_for(target.name))
    _show("generated", profile(ours, Options().prefix, target, chosen.function, joints, libm=False))
    for peer in PEERS:
        if peer.arm == chosen.arm and f"peer_{chosen.function}(" in peer_files(peer)["peer_kin.h"]:
            theirs = profile(peer_files(peer), PEER_PREFIX, target, chosen.function, joints, libm=True)
            _show("hand-written", theirs)


if __name__ == "__main__":
    main()
