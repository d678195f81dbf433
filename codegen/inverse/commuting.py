"""Orders of a segment that are the same motion: a slide along the axis of its neighbour may change places with it."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Rigid, Space
from codegen.inverse.segment import Core, Segment, Use, core_of

_MOST = 12


@dataclass(frozen=True, slots=True)
class Framed:
    """lead . segment . trail: a segment with the constants that reordering moved to its ends."""

    lead: Rigid
    segment: Segment
    trail: Rigid


def orders(space: Space, segment: Segment) -> list[Framed]:
    """The segment itself first, then every other order that commuting neighbours allow."""
    found = [Framed(space.identity, segment, space.identity)]
    seen = {segment.uses}
    for framed in found:
        for k in range(len(segment.uses) - 1):
            other = _swapped(space, framed, k)
            if other is not None and other.segment.uses not in seen and len(found) < _MOST:
                seen.add(other.segment.uses)
                found.append(other)
    return found


def _swapped(space: Space, framed: Framed, k: int) -> Framed | None:
    """Joints k and k + 1 exchanged, when one slides along the other's axis."""
    segment = framed.segment
    first, second = segment.uses[k], segment.uses[k + 1]
    core = segment.cores[k].whole(space)
    z = core.rotation[2][2]
    if first.turns == second.turns or not z.structural or z.value not in (1, -1):
        return None
    sign = int(z.value)
    uses, cores = list(segment.uses), list(segment.cores)
    nothing = core_of(space, space.identity)
    lead, trail = framed.lead, framed.trail
    if first.turns:  # J C P = P' J C
        uses[k], uses[k + 1] = Use(second.joint, second.sign * sign), first
        cores[k] = nothing
        if k + 1 < len(cores):
            cores[k + 1] = _joined(space, core, cores[k + 1])
        else:
            trail = space.compose(core, trail)
    else:  # P C J = C J P'
        uses[k], uses[k + 1] = second, Use(first.joint, first.sign * sign)
        cores[k] = nothing
        if k > 0:
            cores[k - 1] = core_of(space, space.compose(cores[k - 1].whole(space), core))
        else:
            lead = space.compose(lead, core)
    return Framed(lead, Segment(tuple(uses), tuple(cores)), trail)


def _joined(space: Space, motion: Rigid, core: Core) -> Core:
    return Core(space.zero, space.compose(motion, space.slide_z(core.before), core.middle), core.behind)
