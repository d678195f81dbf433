"""The page's JavaScript computes the very bits of the C in doubles: every function, branch and status.

Not to a tolerance: both round every operation to a double (ECMA-262, 6.1.6.1; ISO/IEC 60559), and neither fuses any.
"""

from __future__ import annotations

import subprocess
from pathlib import Path

import numpy as np
import pytest
from arms_random import (
    AROUND_3_4_5,
    AXIS_ARMS,
    HELD_ARMS,
    PARALLEL,
    PITCH_ARMS,
    SPHERICAL,
    THREE_SLIDES,
    Structure,
    random_arm,
)
from generated import kinematics
from javascript_bits import bits, by_c, by_node, inputs_of
from required_tools import need_programs
from test_tracking_steps import ARMS as WITHOUT_CLOSED_FORM

from codegen.armfile import read_arm
from codegen.javascript import javascript
from codegen.javascript.preprocess import preprocessed
from codegen.javascript.types import NotTranslatable
from codegen.model import Arm
from codegen.places import ARMS

EXAMPLES = sorted(ARMS.glob("*.toml"))
RANDOM = [*SPHERICAL[6:8], *PARALLEL[5:7], AROUND_3_4_5[1], THREE_SLIDES[0], AXIS_ARMS[0], PITCH_ARMS[1], HELD_ARMS[0]]
TRACKED = ["pose with a slide", "point_axis with a joint held", "point_pitch", "plane_pose"]


def assert_same_bits(arm: Arm, folder: Path, count: int) -> None:
    need_programs("node")
    c = kinematics(arm)
    given = inputs_of(arm, c, count, seed=7)
    wanted, found = by_c(c, given), by_node(arm, c, given, folder)
    assert len(found) == len(wanted)
    different = np.flatnonzero(bits(found) != bits(wanted))
    assert len(different) == 0, (different[:5], wanted[different[:5]], found[different[:5]])


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_the_javascript_of_an_example_computes_the_bits_of_its_c(path: Path, tmp_path: Path) -> None:
    assert_same_bits(read_arm(path).arm, tmp_path, 40)


@pytest.mark.parametrize("structure", RANDOM, ids=lambda structure: structure.name)
def test_so_does_that_of_a_random_arm(structure: Structure, tmp_path: Path) -> None:
    assert_same_bits(random_arm(structure, 1), tmp_path, 24)


@pytest.mark.parametrize("name", TRACKED)
def test_so_does_that_of_an_arm_without_a_closed_form(name: str, tmp_path: Path) -> None:
    assert_same_bits(WITHOUT_CLOSED_FORM[name], tmp_path, 8)


# -- the translation itself --------------------------------------------------------------------------------------------
HEADER = """\
#ifndef ARM_KIN_H
#define ARM_KIN_H
#define ARM_JOINTS 2
typedef double arm_real;
#endif
"""


def translated(body: str) -> str:
    """What C functions become, without indents."""
    text = javascript({"arm_kin.h": HEADER, "arm_kin.c": body}, "arm")
    return "\n".join(line.strip() for line in text.splitlines())


@pytest.mark.parametrize(
    ("c", "js"),
    [
        ("return a - (b - c);", "return a - (b - c);"),
        ("return (a - b) - c;", "return a - b - c;"),
        ("return a * b / c;", "return a * b / c;"),
        ("return a * (b / c);", "return a * (b / c);"),
        ("return -(a + b) * c;", "return -(a + b) * c;"),
        ("return (a < b) ? -a : b;", "return a < b ? -a : b;"),
        ("return (a < b && b < c) || !(c > a) ? a : c;", "return (a < b && b < c) || !(c > a) ? a : c;"),
    ],
)
def test_arithmetic_of_doubles_keeps_its_order(c: str, js: str) -> None:
    text = translated(f"arm_real arm_f(arm_real a, arm_real b, arm_real c)\n{{\n    {c}\n}}\n")
    assert js in text.splitlines()


def evaluated(body: str, call: str) -> str:
    """What node prints for a call of the functions that the C becomes."""
    need_programs("node")
    text = javascript({"arm_kin.h": HEADER, "arm_kin.c": body}, "arm")
    program = text[: text.index("  return {\n")] + f"  return {call};\n}})()"
    done = subprocess.run(["node", "-p", program], capture_output=True, text=True, check=True)
    return done.stdout.strip()


@pytest.mark.parametrize(("a", "w", "i"), [(0, 0, 0), (5, 2**64 - 1, -7), (2**32 - 1, 2**63 + 12345, -(2**31))])
def test_whole_numbers_keep_the_digits_of_their_type(a: int, w: int, i: int) -> None:
    """Modulo 2^32 and 2^64 (ISO/IEC 9899:2011, 6.2.5 p9), quotients cut towards zero (6.5.5 p6)."""
    body = """
        unsigned arm_f(unsigned a, uint64_t w, int i)
        {
            unsigned b = a * 2654435769u - 1u;
            b |= 1u << (a & 7u);
            w = (w << 2) + 0x9E3779B97F4A7C15u;
            return (unsigned)(w >> 31) + b / 3u + (unsigned)(i / 3) + ~a;
        }
        """
    b = (a * 2654435769 - 1) % 2**32 | 1 << (a & 7)
    word = ((w << 2) + 0x9E3779B97F4A7C15) % 2**64
    wanted = ((word >> 31) + b // 3 + int(i / 3) + ~a) % 2**32
    assert evaluated(body, f"arm_f({a}, {w}n, {i})") == str(wanted)


STRUCTS = """
typedef struct arm_pair {
    arm_real c;
    arm_real s;
} arm_pair;

typedef struct arm_pairs {
    arm_pair list[2];
    arm_real x[3];
    unsigned count;
} arm_pairs;

static void arm_change(arm_pair *pair, arm_real *number, arm_real tail[2])
{
    pair->s = 9.0;
    *number += 4.0;
    tail[1] = 0.125;
}

static arm_real arm_taken(const arm_real (*rows)[2], unsigned row)
{
    return rows[row][0] - rows[row][1];
}

static arm_pair arm_swapped(const arm_pair *pair)
{
    arm_pair other = *pair;
    other.c = pair->s;
    other.s = pair->c;
    return other;
}

arm_real arm_f(void)
{
    arm_pair a = {1.0, 2.0};
    arm_pair b = a;
    arm_pairs some = {{{3.0, 4.0}, {5.0, 6.0}}, {0.5, 0.25, 0.75}, 2u};
    arm_pairs others;
    arm_real local = 10.0;
    arm_real *number = &local;
    arm_real several[2][2] = {{2.0, 0.5}, {4.0, 1.0}};
    arm_pair *const second = &some.list[1];

    b.c = 50.0;
    others = some;
    others.list[0].c = 300.0;
    others.x[0] = 700.0;
    some.list[0] = a;
    a.s = 20.0;
    arm_change(second, &local, &some.x[1]);
    arm_change(&b, &some.x[0], others.x);
    *second = arm_swapped(second);
    *number += arm_taken((const arm_real (*)[2])several, 1u);
    number = several[0];
    *number += arm_taken((const arm_real (*)[2])several[1], 0u) * several[0][0];
    number = &several[1][1];
    *number -= arm_taken((const arm_real (*)[2])several, 0u);
    local += several[1][1];
    return a.c + 2.0 * a.s + 3.0 * b.c + 5.0 * b.s + 7.0 * some.list[0].s + 11.0 * some.list[1].c
            + 13.0 * some.list[1].s + 17.0 * others.list[0].c + 19.0 * others.list[1].s + 23.0 * local
            + 29.0 * some.x[0] + 31.0 * some.x[2] + 37.0 * others.x[0] + 41.0 * others.x[1] + (arm_real)others.count;
}
"""


def test_structs_are_copied_and_pointed_at_as_in_c(tmp_path: Path) -> None:
    """Against gcc: two names of one struct change together, a copy does not."""
    need_programs("gcc")
    main = 'int main(void)\n{\n    printf("%.17g", arm_f());\n    return 0;\n}\n'
    (tmp_path / "structs.c").write_text(f"#include <stdio.h>\n{HEADER}{STRUCTS}\n{main}", encoding="utf-8")
    subprocess.run(["gcc", "-std=c99", "-o", "structs", "structs.c"], cwd=tmp_path, check=True)
    printed = subprocess.run([tmp_path / "structs"], capture_output=True, text=True, check=True).stdout
    assert float(evaluated(STRUCTS, "arm_f()")) == float(printed)


def test_words_of_javascript_are_no_names() -> None:
    text = translated("arm_real arm_f(arm_real new)\n{\n    const arm_real let = new;\n    return let;\n}\n")
    assert "const let_ = new_;" in text


def test_what_the_translation_does_not_know_is_refused() -> None:
    for body in (
        "arm_real arm_f(arm_real a)\n{\n    while (a > 0.0) { a -= 1.0; }\n    return a;\n}\n",
        "arm_real arm_f(arm_real a)\n{\n    return unknown(a);\n}\n",
        "arm_real arm_f(arm_real a)\n{\n    arm_real *const p = &a;\n    return *p;\n}\n",
    ):
        with pytest.raises(NotTranslatable):
            translated(body)


def test_the_preprocessor_takes_the_portable_way() -> None:
    source = """\
#if defined(__GNUC__) && ((__ARM_FP & 8) != 0)
int a;
#elif DBL_MANT_DIG == 53
int b;
#if defined(NONE) || !defined(ARM_JOINTS)
int c;
#endif
#else
int d;
#endif
int e[ARM_JOINTS];  /* ARM_JOINTS */
"""
    lines = [line.strip() for line in preprocessed(HEADER, source).splitlines()]
    assert lines == ["typedef double arm_real;", "int b;", "int e[2];"]
    with pytest.raises(ValueError, match="no such target"):
        preprocessed(HEADER, "#if DBL_MANT_DIG != 53\n#error none\n#else\n#error no such target\n#endif\n")
