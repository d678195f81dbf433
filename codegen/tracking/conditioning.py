"""Keep the constants of a chain small when its axes are nearly parallel.

The common normal of two nearly parallel axes lies far away, so a measured link table may hold link offsets of hundreds
of metres that cancel each other. In binary32 that loses tens of micrometres. A joint, turning about its z axis or
sliding along it, commutes with a shift along that axis:

    K(i-1) J(i) K(i)  =  (K(i-1) Trans_z(s)) J(i) (Trans_z(-s) K(i))

so every origin may slide along its own axis without changing the motion. Here the origins that need it slide to where
the squares of the translations add up to least. Chains without such cancelling offsets come back untouched, with their
zeros.
"""

from __future__ import annotations

from collections.abc import Sequence

from codegen.exact import MP, Real

Matrix = Real  # a 4x4 mpmath matrix


def balanced_links(links: Sequence[Matrix]) -> tuple[Matrix, ...]:
    """Links K0..Kn (4x4, metres) of the same motion, without translations that cancel each other.

    T = K0 J1 K1 ... Jn Kn is the same for all joint values. Joint i stands between K(i-1) and Ki. Links come back as
    they are when none of them is longer than the whole chain is after the best shifts.
    """
    everywhere = _shifts(links, range(1, len(links)))
    whole_length = sum(_length(link) for link in _shifted(links, everywhere))
    inflated = [i for i in range(1, len(links) - 1) if _length(links[i]) > whole_length]
    touched = sorted({joint for i in inflated for joint in (i, i + 1)})
    if not touched:
        return tuple(links)
    return _shifted(links, _shifts(links, touched))


def _shifts(links: Sequence[Matrix], joints: Sequence[int]) -> dict[int, Real]:
    """The shift (m) of each listed joint's origin along its axis, by least squares over all links.

    Link i reads t(i) - s(i) z + s(i+1) R(i) z, with z = (0, 0, 1): the normal equations of that are solved as they
    stand, 60 digits being far more than their condition takes.
    """
    if not joints:
        return {}
    column = {joint: k for k, joint in enumerate(joints)}
    normal, right = MP.zeros(len(joints)), MP.zeros(len(joints), 1)
    for i, link in enumerate(links):
        terms = [
            (column[joint], [sign * entry for entry in axis])
            for joint, sign, axis in _moves(i, link)
            if joint in column
        ]
        for row, first in terms:
            right[row] -= sum(first[k] * link[k, 3] for k in range(3))
            for other, second in terms:
                normal[row, other] += sum(first[k] * second[k] for k in range(3))
    solution = MP.lu_solve(normal, right)
    return {joint: solution[k] for joint, k in column.items()}


def _moves(i: int, link: Matrix) -> tuple[tuple[int, int, list[Real]], ...]:
    """(joint, sign, direction) of the two joints whose shifts move the translation of link i."""
    return (i, -1, [0, 0, 1]), (i + 1, 1, [link[k, 2] for k in range(3)])


def _shifted(links: Sequence[Matrix], shifts: dict[int, Real]) -> tuple[Matrix, ...]:
    changed = []
    for i, link in enumerate(links):
        copy = link.copy()
        for joint, sign, axis in _moves(i, link):
            for k in range(3):
                if joint in shifts and axis[k] != 0:
                    copy[k, 3] += sign * shifts[joint] * axis[k]
        changed.append(copy)
    return tuple(changed)


def _length(link: Matrix) -> Real:
    return MP.sqrt(sum(link[k, 3] ** 2 for k in range(3)))
