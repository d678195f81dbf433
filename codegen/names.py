"""Joint names as identifiers: safe in C and in the words of a derivation."""

from __future__ import annotations

import re

from codegen.model import Arm

_RESERVED = frozenset(
    """auto break case char const continue default do double else enum extern float for goto if inline int long register
    restrict return short signed sizeof static struct switch typedef union unsigned void volatile while asm bool true false
    class new delete this template typename namespace using public private protected virtual operator friend try catch
    throw and or not xor bitand bitor compl and_eq or_eq xor_eq not_eq export explicit mutable wchar_t typeid near far
    interrupt alignas alignof constexpr decltype noexcept nullptr static_assert thread_local concept requires
    work pose q seed branch status jac joint turn second choice known axis unix linux errno signed main
    heading pitch tool_roll centre last_frame miss sine cosine value real word bits""".split()  # noqa: SIM905
)


def joint_identifiers(arm: Arm) -> tuple[str, ...]:
    """One C identifier a joint, in the order of the joints: its own name where that is safe."""
    found: list[str] = []
    for row in arm.joints:
        name = re.sub(r"\W", "_", row.name, flags=re.ASCII).strip("_").lower() or "joint"
        if name[0].isdigit():
            name = f"joint_{name}"
        if name in _RESERVED:
            name = f"{name}_joint"
        while name in found:
            name += "_too"
        found.append(name)
    return tuple(found)
