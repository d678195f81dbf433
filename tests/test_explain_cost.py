"""The operation counts against the C itself: compiled as C++ with a number type that counts what is done to it."""

from __future__ import annotations

import re
import shutil
import subprocess
from dataclasses import astuple, replace
from pathlib import Path

import numpy as np
import pytest
from arms_random import PITCH_ARMS, POINT_ARMS, POSE_ARMS, Structure, random_arm
from generated import kinematics

from build_checks.compile import Status
from build_checks.reference import Array, Reference
from codegen.armfile import read_arm
from codegen.cost_static import InverseCount, OperationCount, forward_count, inverse_count, jacobian_count
from codegen.emit.expression import Constants
from codegen.emit.inverse_text import InverseText
from codegen.inverse.tasks import Derivation, derive, step_nodes
from codegen.model import Arm
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate
from codegen.places import ARMS
from codegen.program import Op, reachable

OPTIONS = Options(RealType.DOUBLE, Mathematics.LIBM)
BY_BITS = {  # small functions of the C that read the bits of a number, in terms of one that has none
    "is_finite": "return std::isfinite(x.value);",
    "abs": "return Counted(std::fabs(x.value), x.constant);",
    "within": "return std::fabs(x.value) <= bound.value;",
}
NOT_COUNTED = (  # checks of the input, comparisons, copies, what runs seldom
    "all_finite",
    "usable",
    "take_pose",
    "past_limit",
    "settle_far",
    "turned_to",
    "travel",
    "retrace",
)

COUNTED = """
#include <cmath>
#include <cstdint>
struct Counts { long add, multiply, divide, root, arc_tangent, pair; };
static Counts counts;
static int suspended = 0;
struct Uncounted { Uncounted() { ++suspended; } ~Uncounted() { --suspended; } };
static void note(long Counts::*operation, bool constant) { if (!constant && suspended == 0) ++(counts.*operation); }
struct Counted {
    double value; bool constant;
    Counted() : value(0.0), constant(false) {}
    Counted(double literal) : value(literal), constant(true) {}
    Counted(int32_t whole) : value(whole), constant(false) {}
    Counted(double v, bool fixed) : value(v), constant(fixed) {}
    explicit operator int32_t() const { return static_cast<int32_t>(value); }
    Counted operator-() const { return Counted(-value, constant); }
    Counted &operator+=(Counted other);
    Counted &operator-=(Counted other);
    Counted &operator*=(Counted other);
    Counted &operator/=(Counted other);
};
#define OPERATION(sign, name) \\
    static Counted operator sign(Counted a, Counted b) { \\
        const bool fixed = a.constant && b.constant; \\
        note(&Counts::name, fixed); \\
        return Counted(a.value sign b.value, fixed); \\
    }
OPERATION(+, add) OPERATION(-, add) OPERATION(*, multiply) OPERATION(/, divide)
inline Counted &Counted::operator+=(Counted other) { return *this = *this + other; }
inline Counted &Counted::operator-=(Counted other) { return *this = *this - other; }
inline Counted &Counted::operator*=(Counted other) { return *this = *this * other; }
inline Counted &Counted::operator/=(Counted other) { return *this = *this / other; }
#define COMPARISON(sign) static bool operator sign(Counted a, Counted b) { return a.value sign b.value; }
COMPARISON(<) COMPARISON(<=) COMPARISON(>) COMPARISON(>=) COMPARISON(==) COMPARISON(!=)
static Counted sqrt(Counted x) { note(&Counts::root, x.constant); return Counted(std::sqrt(x.value), x.constant); }
static Counted sin(Counted x) { note(&Counts::pair, x.constant); return Counted(std::sin(x.value), x.constant); }
static Counted cos(Counted x) { return Counted(std::cos(x.value), x.constant); }
static Counted fabs(Counted x) { return Counted(std::fabs(x.value), x.constant); }
static Counted atan2(Counted y, Counted x) {
    note(&Counts::arc_tangent, y.constant && x.constant);
    return Counted(std::atan2(y.value, x.value), false);
}
"""

MAIN = """
#include <cstdio>
#include <cstring>
#include <cstdlib>
static void show() {
    printf("%ld %ld %ld %ld %ld %ld\\n", counts.add, counts.multiply, counts.divide, counts.root, counts.arc_tangent,
        counts.pair);
    counts = Counts();
}
int main(int argc, char **argv) {
    arm_real q[ARM_JOINTS], found[ARM_JOINTS], all[ARM_BRANCHES][ARM_JOINTS], jac[6][ARM_JOINTS];
    arm_status status[ARM_BRANCHES];
    arm_pose pose;
    for (int i = 0; i < ARM_JOINTS; ++i) q[i] = Counted(strtod(argv[i + 1], NULL), false);
    const unsigned branch = static_cast<unsigned>(atoi(argv[argc - 1]));
    arm_forward(q, &pose);
    show();
    arm_jacobian(q, jac);
    show();
    for (int i = 0; i < 3; ++i) {
        pose.p[i].constant = false;
        for (int j = 0; j < 3; ++j) pose.r[i][j].constant = false;
    }
    arm_inverse(&pose, branch, q, found);
    show();
    arm_inverse_all(&pose, q, all, status);
    show();
    return 0;
}
"""


def counting_program(arm: Arm, folder: Path, not_counted: tuple[str, ...]) -> Path:
    """The generated C with its number type replaced and the functions that are not counted marked."""
    compiler = shutil.which("g++") or shutil.which("c++")
    assert compiler, "a C++ compiler is needed"
    files = generate(arm, OPTIONS)
    header = files["arm_kin.h"].replace("typedef double arm_real;", "typedef Counted arm_real;")
    assert "Counted" in header
    header = header.replace('extern "C" {', 'extern "C++" {')
    code = re.sub(r"^#include <math.h>$", "", files["arm_kin.c"], flags=re.MULTILINE)
    code = re.sub(r"^typedef union arm_bits \{.*?^\} arm_bits;$", "", code, flags=re.MULTILINE | re.DOTALL)
    for name, body in BY_BITS.items():
        function = rf"(^static \w+ arm_{name}\([^;{{]*\)\n\{{\n).*?^\}}$"
        code = re.sub(function, rf"\1    {body}\n}}", code, flags=re.MULTILINE | re.DOTALL)
    for name in not_counted:
        code, count = re.subn(rf"(\barm_{name}\([^;{{]*\)\n\{{\n)", r"\1    Uncounted here;\n", code)
        assert count <= 1, name
    (folder / "arm_kin.h").write_text(COUNTED + header, encoding="utf-8")
    (folder / "counting.cpp").write_text(code + MAIN, encoding="utf-8")
    command = [compiler, "-std=c++17", "-w", "-O0", "-o", "counting", "counting.cpp"]
    subprocess.run(command, cwd=folder, check=True, capture_output=True)
    return folder / "counting"


def ordinary(arm: Arm) -> tuple[Array, int]:
    """Joint values whose pose as many branches reach as possible, and the branch they lie on."""
    c = kinematics(arm)
    q = Reference(arm).random_joints(np.random.default_rng(5), 4000)
    packed, _ = c.forward(c.rounded(q))
    status = c.inverse_all(packed, c.rounded(q)).status
    best = int(np.argmax((status != Status.OUT_OF_REACH).sum(axis=1)))
    return q[best], int(c.branch_of(c.rounded(q[best : best + 1]))[0])


def measured(arm: Arm, folder: Path, not_counted: tuple[str, ...]) -> tuple[list[OperationCount], bool]:
    """Counts of forward, Jacobian, one branch, all branches; and whether every branch was solved in full."""
    q, branch = ordinary(arm)
    program = counting_program(arm, folder, not_counted)
    done = subprocess.run(
        [program, *(repr(float(value)) for value in q), str(branch)], check=True, capture_output=True, text=True
    )
    counts = [OperationCount(*map(int, line.split())) for line in done.stdout.splitlines()]
    c = kinematics(arm)
    packed, _ = c.forward(c.rounded(q[None]))
    found = c.inverse_all(packed, c.rounded(q[None])).status[0]
    return counts, bool((found != Status.OUT_OF_REACH).all())


def structure(name: str, structures: list[Structure]) -> Structure:
    return next(one for one in structures if one.name == name)


FROM_FILES = [read_arm(path).arm for path in sorted(ARMS.glob("*.toml"))]
DRAWN = [
    random_arm(structure(name, structures), number)
    for name, structures, number in [
        ("point PRP", POINT_ARMS, 0),
        ("point, 1 parallel to 2 RRP", POINT_ARMS, 1),
        ("pitch PRRR", PITCH_ARMS, 0),
    ]
    if any(one.name == name for one in structures)
]


@pytest.mark.parametrize("arm", [*FROM_FILES, *DRAWN], ids=lambda arm: arm.name)
def test_the_counts_are_those_of_the_running_c(arm: Arm, tmp_path: Path) -> None:
    derivation = derive(arm)
    assert derivation is not None
    inverse = inverse_count(derivation, OPTIONS)
    assert not inverse.worst
    counts, complete = measured(arm, tmp_path, (*NOT_COUNTED, "reached"))
    assert counts[:2] == [forward_count(arm, OPTIONS), jacobian_count(arm, OPTIONS, derivation)]
    assert complete
    sums, products = operations_of_choices(derivation)
    for done, told, runs in zip(counts[2:], (inverse.one_branch, inverse.all_branches), (1, 2 * c_branches(arm)), strict=True):
        assert 0 <= told.additions - done.additions <= sums * runs
        assert 0 <= told.multiplications - done.multiplications <= products * runs
        assert replace(done, additions=told.additions, multiplications=told.multiplications) == told


def operations_of_choices(derivation: Derivation) -> tuple[int, int]:
    """Sums and products of which the C does only those on the side that it takes; half turns it takes for one root only."""
    nodes = reachable([node for step in derivation.plan.steps for node in step_nodes(step)])
    sides = reachable([arg for node in nodes if node.op is Op.CHOICE for arg in node.args[1:]])
    half_turns = sum(flip.cosine for flip in InverseText(derivation, OPTIONS, Constants(OPTIONS)).mirror())
    return sum(node.op is Op.SUM for node in sides) + half_turns, sum(node.op is Op.PRODUCT for node in sides)


def c_branches(arm: Arm) -> int:
    return kinematics(arm).branches


QUARTICS = [structure("wrist", POSE_ARMS), structure("point RRR", POINT_ARMS)]


@pytest.mark.parametrize("kind", QUARTICS, ids=lambda kind: kind.name)
def test_a_search_stays_below_its_worst_count(kind: Structure, tmp_path: Path) -> None:
    arm = random_arm(kind, 0)
    derivation = derive(arm)
    assert derivation is not None
    inverse = inverse_count(derivation, OPTIONS)
    assert isinstance(inverse, InverseCount)
    assert inverse.worst
    counts, _ = measured(arm, tmp_path, NOT_COUNTED)
    assert all(done <= most for done, most in zip(astuple(counts[2]), astuple(inverse.one_branch), strict=True))
    assert all(done <= most for done, most in zip(astuple(counts[3]), astuple(inverse.all_branches), strict=True))
    assert counts[2].multiplications > inverse.one_branch.multiplications / 30  # a bound, not a fancy
