"""The chain of an arm as constant links between its joints: T = K0 J1 K1 ... Jn Kn, J = Rot_z(q) or Trans_z(q).

Denavit and Hartenberg, "A kinematic notation for lower-pair mechanisms based on matrices", J. Appl. Mech. 22 (1955);
the modified rows cut the same alternation one place earlier.
"""

from __future__ import annotations

from codegen.chain import Chain, ChainJoint
from codegen.exact import MP, Angle, Real, real
from codegen.geometry import Rigid, Space
from codegen.model import Arm, Convention, Frame
from codegen.program import Builder, Node
from codegen.tracking.conditioning import Matrix, balanced_links


def links_of(arm: Arm) -> tuple[Matrix, ...]:
    """K0..Kn (4x4, metres), cancelling offsets along near-parallel axes removed."""
    return balanced_links(raw_links(arm))


def raw_links(arm: Arm) -> tuple[Matrix, ...]:
    """K0..Kn (4x4, metres) as the table has them, base and tool frames included."""
    links = [frame_matrix(arm.base)]
    for row in arm.joints:
        along_x = _rotation(0, row.alpha) * _translation(real(row.a), 0, 0)
        along_z = _rotation(2, row.theta) * _translation(0, 0, real(row.d))
        if arm.convention is Convention.STANDARD:
            links.append(along_z * along_x)
        else:
            links[-1] = links[-1] * along_x
            links.append(along_z)
    links[-1] = links[-1] * frame_matrix(arm.tool)
    return tuple(links)


def frame_matrix(frame: Frame) -> Matrix:
    """Trans(xyz) Rz(yaw) Ry(pitch) Rx(roll)."""
    roll, pitch, yaw = frame.rpy
    x, y, z = (real(value) for value in frame.xyz)
    return _translation(x, y, z) * _rotation(2, yaw) * _rotation(1, pitch) * _rotation(0, roll)


def small_chain(arm: Arm, builder: Builder) -> Chain | None:
    """The chain with small constants, made in `builder`; None where the link table's own are small enough."""
    raw = raw_links(arm)
    links = balanced_links(raw)
    if all(before is after for before, after in zip(raw, links, strict=True)):
        return None
    zero = Space(builder).zero
    joints = tuple(ChainJoint(index, row.kind, row.name, zero, zero) for index, row in enumerate(arm.joints))
    return Chain(joints, tuple(_core(builder, number, link) for number, link in enumerate(links)))


def _core(builder: Builder, number: int, link: Matrix) -> Rigid:
    """A link whose entries are constants named after their places."""

    def entry(i: int, j: int) -> Node:
        value = link[i, j]
        if value in (0, 1, -1):
            return builder.integer(int(value))
        what = "shift" if j == 3 else "turn"
        name = f"LINK{number}_{'XYZ'[i]}" if j == 3 else f"LINK{number}_{i}{j}"
        return builder.constant(name, value, f"{what} between joints {number} and {number + 1}")

    x, y, z = ((entry(i, 0), entry(i, 1), entry(i, 2)) for i in range(3))
    return Rigid((x, y, z), (entry(0, 3), entry(1, 3), entry(2, 3)))


def _translation(x: Real, y: Real, z: Real) -> Matrix:
    matrix = MP.eye(4)
    matrix[0, 3], matrix[1, 3], matrix[2, 3] = x, y, z
    return matrix


def _rotation(axis: int, angle: Angle) -> Matrix:
    """About coordinate axis 0 (x), 1 (y) or 2 (z)."""
    cosine, sine = angle.cosine_sine()
    first, second = (axis + 1) % 3, (axis + 2) % 3
    matrix = MP.eye(4)
    matrix[first, first] = matrix[second, second] = cosine
    matrix[second, first], matrix[first, second] = sine, -sine
    return matrix
