"""The chain of an arm as constant links between its joints: T = K0 J1 K1 ... Jn Kn, J = Rot_z(q) or Trans_z(q).

Denavit and Hartenberg, "A kinematic notation for lower-pair mechanisms based on matrices", J. Appl. Mech. 22 (1955);
the modified rows cut the same alternation one place earlier.
"""

from __future__ import annotations

from codegen.exact import MP, Angle, Real, real
from codegen.model import Arm, Convention, Frame, JointRow
from codegen.tracking.conditioning import Matrix, balanced_links


def links_of(arm: Arm) -> tuple[Matrix, ...]:
    """K0..Kn (4x4, metres): base and tool frames included, cancelling offsets along near-parallel axes removed."""
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
    return balanced_links(links)


def frame_matrix(frame: Frame) -> Matrix:
    """Trans(xyz) Rz(yaw) Ry(pitch) Rx(roll)."""
    roll, pitch, yaw = frame.rpy
    x, y, z = (real(value) for value in frame.xyz)
    return _translation(x, y, z) * _rotation(2, yaw) * _rotation(1, pitch) * _rotation(0, roll)


def row_lengths(row: JointRow) -> Real:
    """How much one row of the table can add to the reach (m), its slide left out."""
    return abs(real(row.a)) + abs(real(row.d))


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
