"""Faults planted in generated C: every kind finds its places, agree sees every fault, and what it does not see is none."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import pytest
from required_tools import need_programs

from build_checks.mutate import PORTABLE, Original, Outcome, faults, judge, spread, survivors, table
from build_checks.mutate_kinds import Edit, Kind, Mutant, mutants
from build_checks.mutate_known import why_equivalent
from build_checks.mutate_tokens import read_source
from build_checks.mutate_triage import Difference
from codegen.armfile import read_arm
from codegen.errors import CheckFailedError
from codegen.options import Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
FEW, MORE = 2, 12  # faults of each kind

SNIPPET = """/* a - b in a comment is no sum */
#define ARM_JOINTS 2
static const arm_real A2 = 0.5f;
static const arm_real LEAST_ANGLE = 2.0e-6f;
static const arm_range RANGES[1] = {
    {-1.5f, 2.5f, 0.25f}
};
enum { MARK_FREE = 1 };
static arm_real arm_atan2(arm_real y, arm_real x)
{
    const arm_real a1 = -0.25f;
    return (y < x) ? a1 : y - x;
}
static void arm_stage(arm_work *work, unsigned joint)
{
    const arm_real angle = arm_atan2(work->pair.s, work->pair.c);
    if ((angle > 0.0f) && (joint != 2u)) {
        work->q[1] = work->seed[joint] + 1.0f * FULL_TURN;
    }
    for (int i = 0; i < ARM_JOINTS; ++i) {
        arm_note(work);
    }
}
"""


def edits(kind: Kind) -> set[tuple[str, str]]:
    """(what stands there, what is put there)"""
    lines = frozenset(range(1, SNIPPET.count("\n") + 1))
    found = mutants(read_source(SNIPPET), lines)
    return {(mutant.before, mutant.edit.text) for mutant in found if mutant.kind is kind}


EDITS = [
    (Kind.ARGUMENTS, {("work->pair.s, work->pair.c", "work->pair.c, work->pair.s")}),
    (Kind.SIGN, {("-", "+"), ("-", ""), ("+", "-")}),
    (Kind.CONSTANT, {("0.5f", "(0.500005f)"), ("0.25f", "(0.2500025f)"), ("1.0f", "(1.00001f)")}),
    (Kind.COEFFICIENT, {("0.25f", "(0.2575f)")}),
    (Kind.TOLERANCE, {("2.0e-6f", "(0.002048f)"), ("2.0e-6f", "(0.0f)")}),
    (Kind.BRANCH, {("((angle > 0.0f) && (joint != 2u))", "(0)"), ("((angle > 0.0f) && (joint != 2u))", "(1)")}),
    (Kind.GUARD, {("(angle > 0.0f) &&", ""), ("&& (joint != 2u)", "")}),
    (Kind.CLAMP, {("(y < x) ? a1 : y - x", "a1"), ("(y < x) ? a1 : y - x", "y - x")}),
    (Kind.CHOICE, {("a1 : y - x", "y - x : a1")}),
    (Kind.PAIR, {("s", "c"), ("c", "s")}),
    (Kind.SEED, {("work->seed[joint]", "0")}),
    (Kind.TURNS, {("FULL_TURN", "FULL_TURN + FULL_TURN")}),
    (Kind.COMPARISON, {("<", ">"), (">", "<"), ("!=", "==")}),
    (Kind.STATEMENT, {("work->q[1] = work->seed[joint] + 1.0f * FULL_TURN;", ";"), ("arm_note(work);", ";")}),
    (Kind.INDEX, {("1", "0")}),
    (Kind.INTEGER, {("1", "2"), ("2u", "3u"), ("0", "1")}),
]


@pytest.mark.parametrize(("kind", "wanted"), EDITS, ids=lambda value: getattr(value, "name", ""))
def test_each_kind_finds_its_places(kind: Kind, wanted: set[tuple[str, str]]) -> None:
    assert edits(kind) == wanted


def test_limits_move_by_a_little_both_ways() -> None:
    moved = sorted(float(text.strip("()f")) for before, text in edits(Kind.LIMIT) if before == "2.5f")
    assert {before for before, _ in edits(Kind.LIMIT)} == {"1.5f", "2.5f"}
    assert moved == pytest.approx([2.499995, 2.500005], abs=1e-12)


def test_every_kind_is_tried() -> None:
    assert {kind for kind, _ in EDITS} | {Kind.LIMIT} == set(Kind)


@cache
def original(name: str, real: RealType = RealType.FLOAT, flags: tuple[str, ...] = (), seconds: int = 30) -> Original:
    need_programs("gcc")
    arm, options = read_arm(ARMS / f"{name}.toml").arm, Options(real=real)
    return Original(arm, generate(arm, options), options, flags, seconds)


def replaced(what: Original, good: str, bad: str) -> Mutant:
    """A fault written by hand."""
    text = what.files[what.file]
    assert good in text, f"{what.file} has no {good!r}"
    start = text.index(good)
    line = text.count("\n", 0, start) + 1
    return Mutant(Kind.STATEMENT, "by hand", line, Edit(start, start + len(good), bad), good)


FORWARD = "arm_status arm_forward(const arm_real q[ARM_JOINTS], arm_pose *pose)\n{\n"
BY_HAND = [  # what is put there, caught by, why it is no fault
    (FORWARD + "    while (true) { }\n", "crashes or never ends", ""),
    (FORWARD + "    *(volatile int *)16 = 1;\n", "crashes or never ends", ""),
    (FORWARD + "    this is no C\n", "does not compile", ""),
    (FORWARD + "    if (q[0] > 0.3f) { return ARM_BAD_INPUT; }\n", "FORWARD", ""),
    (FORWARD + "    /* a remark */\n", "", "the compiler makes the same machine code of it"),
    (FORWARD + "    volatile int unused = 1; (void)unused;\n", "", Difference.NONE.value),
]


@pytest.fixture(scope="module")
def by_hand() -> list[Outcome]:
    what = original("plotter", seconds=8)
    return judge(what, [replaced(what, FORWARD, bad) for bad, _, _ in BY_HAND])


@pytest.mark.parametrize(("bad", "caught", "reason"), BY_HAND)
def test_what_becomes_of_a_fault(bad: str, caught: str, reason: str, by_hand: list[Outcome]) -> None:
    """A mutant that crashes or never ends is caught, and the next one is judged as ever."""
    row = next(row for row in by_hand if row.mutant.edit.text == bad)
    assert row.equivalent == reason
    assert caught in row.caught_by if caught else row.caught_by == ()


def test_the_table_counts_and_names_survivors(by_hand: list[Outcome]) -> None:
    mutant = by_hand[0].mutant
    text = table(
        [Outcome(mutant, ("FORWARD",)), Outcome(mutant, (), "proved"), Outcome(mutant, (), "", "other results")]
    )
    assert "      3       1           1         1" in text
    assert "    1  proved" in text
    assert "(other results)" in text.split("survived:")[1]


def test_c_that_does_not_agree_is_refused_before_any_fault_is_planted() -> None:
    what = original("plotter")
    wrong = {**what.files, what.file: what.files[what.file].replace("A2 = 0.15f", "A2 = 0.16f")}
    assert wrong != what.files
    with pytest.raises(CheckFailedError, match="does not agree before"):
        judge(Original(what.arm, wrong, what.options), [])


def test_a_difference_below_rounding_is_no_fault_and_a_larger_one_is() -> None:
    """A length wrong by a tenth of a float's last place, and one wrong in the fifth digit: agree sees that one."""
    what = original("plotter")
    tiny, large = replaced(what, "A2 = 0.15f", "A2 = 0.15000000596f"), replaced(what, "A2 = 0.15f", "A2 = 0.15001f")
    outcomes = {row.mutant.edit.text: row for row in judge(what, [tiny, large])}
    assert outcomes[tiny.edit.text].equivalent
    assert outcomes[large.edit.text].caught_by


def test_reasons_name_faults_by_kind_function_and_line() -> None:
    mutant = Mutant(Kind.INTEGER, "arm_nothing", 3, Edit(0, 1, "2"), "1")
    assert why_equivalent(mutant, "a line that nothing matches") == ""


@pytest.mark.parametrize("name", ["vial_picker"])
def test_agree_sees_a_few_faults_of_every_kind(name: str) -> None:
    what = original(name)
    outcomes = judge(what, spread(faults(what), FEW))
    assert [str(row.mutant) for row in survivors(outcomes)] == [], table(outcomes)
    assert sum(bool(row.caught_by) for row in outcomes) > len(outcomes) / 2


@pytest.mark.sweep
@pytest.mark.parametrize(
    ("name", "real", "flags"),
    [
        ("bench_six", RealType.FLOAT, ()),
        ("tray_scara", RealType.DOUBLE, ()),
        ("seven_held", RealType.FLOAT, ()),
        ("plotter", RealType.FLOAT, PORTABLE),
        ("plotter", RealType.DOUBLE, PORTABLE),
    ],
    ids=lambda value: getattr(value, "c_name", value if isinstance(value, str) else "portable" if value else "plain"),
)
def test_agree_sees_many_faults_of_every_kind(name: str, real: RealType, flags: tuple[str, ...]) -> None:
    what = original(name, real, flags)
    outcomes = judge(what, spread(faults(what), MORE))
    assert [str(row.mutant) for row in survivors(outcomes)] == [], table(outcomes)
