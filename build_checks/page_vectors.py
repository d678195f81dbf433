"""What the compiled C gives in doubles at a few poses: the page's script recomputes it in the reader's own browser."""

from __future__ import annotations

import numpy as np

from build_checks.compile import Kinematics, Status, compiled
from build_checks.reference import Reference
from codegen.model import Arm
from codegen.options import Options
from codegen.page.content import Vector

_COUNT, _NUMERIC_COUNT = 12, 3  # tracking takes a browser a while


def page_vectors(arm: Arm, files: dict[str, str], options: Options, seed: int) -> tuple[Vector, ...]:
    """Random joint values with the pose that the C gives there, and every branch of that pose from another start."""
    rng = np.random.default_rng(seed)
    reference = Reference(arm)
    with compiled(files, options) as library:
        c = Kinematics(library)
        count = _NUMERIC_COUNT if c.numeric else _COUNT
        joints, seeds = reference.random_joints(rng, count), reference.random_joints(rng, count)
        poses, _ = c.forward(joints)
        found = c.inverse_all(poses, seeds)
    rows = []
    for k in range(count):
        solved = found.status[k] != Status.OUT_OF_REACH
        branches = [tuple(map(float, q)) if there else None for q, there in zip(found.q[k], solved, strict=True)]
        rows.append(
            Vector(
                tuple(map(float, joints[k])),
                tuple(map(float, seeds[k])),
                tuple(map(float, poses[k])),
                tuple(map(int, found.status[k])),
                tuple(branches),
            )
        )
    return tuple(rows)
