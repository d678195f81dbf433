"""The checker passes C written by hand, sees every fault planted in it, and repeats itself."""

from __future__ import annotations

import dataclasses
import json

import numpy as np
import pytest
from hand_written import GANTRY, TURRET, HandWritten

from build_checks.agree import Settings, agree, units
from build_checks.agree_budget import budget_of
from build_checks.compile import NoCompilerError
from build_checks.report import Check
from build_checks.report_text import to_text
from codegen.errors import CheckFailedError
from codegen.exact import Angle
from codegen.options import Mathematics, Options, RealType

SAMPLES = 2000
FEW = Settings(samples=SAMPLES)


@pytest.mark.parametrize("real", list(RealType), ids=lambda real: real.c_name)
@pytest.mark.parametrize("hand", [TURRET, GANTRY], ids=lambda hand: hand.arm.name)
def test_right_c_agrees(hand: HandWritten, real: RealType):
    """Every check that applies to the arm judged something, and nothing failed."""
    report = agree(hand.arm, hand.files(real), hand.options(real), FEW)
    assert report.agreed, to_text(report)
    judged = {result.check for result in report.results if result.cases}
    unread = {Check.UNREAD} if hand is TURRET else {Check.DRIFTED}
    not_both = {Check.UNREAD, Check.DRIFTED, Check.UNREACHABLE}  # the gantry's lift has no end
    assert set(Check) - {Check.HELD, Check.SEARCH} - not_both <= judged
    assert unread <= judged


# arm, what stands in the C, what the fault puts there, the check that must see it
TURRET_FAULTS = [
    ("atan2(facing * y, facing * x)", "atan2(facing * x, facing * y)", Check.ROUND_TRIP),
    ("const double s3 = elbow * sqrt", "const double s3 = sqrt", Check.KNOWN),
    ("const double facing = branch >= 2 ? -1.0 : 1.0", "const double facing = 1.0", Check.DISTINCT),
    ("#define A3 0.2", "#define A3 0.200002", Check.FORWARD),
    ("#define D1 0.25", "#define D1 0.250002", Check.FORWARD),
    ("{4.5, 2.5, 2.75}", "{4.5, 2.500004, 2.75}", Check.LIMITS),
    ("{4.5, 2.5, 2.75}", "{4.5, 2.499996, 2.75}", Check.LIMITS),
    ("    c3 = fmin(1.0, fmax(-1.0, c3));\n", "", Check.FINITE),
    ("c3 <= 1.0 + 32.0 * EPSILON", "c3 <= 100.0", Check.UNREACHABLE),
    ("c3 <= 1.0 + 32.0 * EPSILON", "c3 <= 1.0 + 1e-4", Check.EDGE_TRIP),
    ("1.0 + 32.0 * EPSILON && c3 >= -1.0 - 32.0 * EPSILON", "1.0 && c3 >= -1.0", Check.EDGE),
    ("return on_axis ? TURRET_SINGULAR : TURRET_OK", "return TURRET_OK", Check.FREE_JOINT),
    ("radius < 4.0 * EPSILON * 0.75", "radius < 0.0", Check.FREE_JOINT),
    ("radius < 4.0 * EPSILON * 0.75", "radius < 1e-4", Check.NOT_FREE),
    ("on_axis ? (double)seed[0]", "on_axis ? 0.1", Check.NOT_FREE),
    ("- (double)seed[i]) / SPEED[i]", "- (double)seed[i])", Check.NEAREST),
    ("{2.0, 1.0, 4.0}", "{2.0, 1.0, 3.99}", Check.NEAREST),
    (": status[b] == TURRET_OVER_LIMIT", ": 0", Check.NEAREST),
    ("*branch = b;", "*branch = b ^ 1u;", Check.NEAREST),
    ("sin((double)q[2]) < 0.0", "sin((double)q[2]) > 0.0", Check.BRANCH_OF),
    ("(out < 0.0 ? 2u : 0u)", "0u", Check.BRANCH_OF),
    ("!all_finite(pose->p, 3) || !all_finite(seed, TURRET_JOINTS)", "!all_finite(pose->p, 3)", Check.BAD_INPUT),
    ("!all_finite(pose->p, 3) || ", "", Check.BAD_INPUT),
    ("!all_finite(pose->p, 3)", "!all_finite(&pose->r[0][0], 12)", Check.UNREAD),
    ("    if (!within) {\n        return TURRET_OVER_LIMIT;\n    }\n", "", Check.LIMITS),
    ("within ? fmin(highest, fmax(lowest, nearest)) : nearest", "within ? lowest : nearest", Check.TURNS),
    ("within ? fmin(highest, fmax(lowest, nearest)) : nearest", "nearest", Check.TURNS),
    ("within ? fmin(highest, fmax(lowest, nearest)) : nearest", "0.0", Check.TURNS),
    ("fmax(lowest, nearest)) : nearest", "fmax(lowest, nearest)) : 0.0", Check.TURNS),
    (
        "for (int i = 0; i < 3; ++i) {\n                q[i]",
        "for (int i = 0; i < 4; ++i) {\n                q[i]",
        Check.OVERRUN,
    ),
    ("branch >= TURRET_BRANCHES", "branch > TURRET_BRANCHES", Check.BAD_BRANCH),
    ("status[branch] == TURRET_SINGULAR;", "status[branch] == TURRET_OVER_LIMIT;", Check.ALL),
    ("{0.0, -c1, -c1}", "{0.0, c1, -c1}", Check.JACOBIAN),
    ("-c1 * A3 * s23}", "-c1 * A3 * s2}", Check.JACOBIAN),
    ("(turret_real)(s1 * out)", "(turret_real)(s1 * out * 1.000003)", Check.FORWARD),
    ("    const double radius = hypot", "    q[0] = seed[0];\n    const double radius = hypot", Check.UNTOUCHED),
    ("atan2((double)y, (double)x)", "atan2((double)y, (double)x + 0.0)", Check.ATAN2),
    ("atan2(s3, c3)};", "atan2(s3, c3) + 1e-5};", Check.ROUND_TRIP),
    ("if (!all_finite(q, TURRET_JOINTS))", "if (!all_finite(q, 2))", Check.BAD_INPUT),
    ("solved += status", "solved += branch != 3 && status", Check.ALL),
]
GANTRY_FAULTS = [
    ("atan2(w[1][0], w[1][1])", "atan2(w[1][1], w[1][0])", Check.ROUND_TRIP),
    ("atan2(w[1][0], w[1][1])", "atan2(-m[2][0], m[2][1])", Check.ROUND_TRIP),
    ("#define D6 0.08", "#define D6 0.080003", Check.ROUND_TRIP),
    ("branch == 1 ? -1.0 : 1.0", "1.0", Check.KNOWN),
    ("< 4.0 * EPSILON;", "< 1e-4;", Check.NOT_FREE),
    ("< 4.0 * EPSILON;", "< 0.0;", Check.FREE_JOINT),
    ("straight ? (double)seed[3]", "straight ? 0.0", Check.NOT_FREE),
    ("    if (turned < 0.0) {\n        return 0;\n    }\n", "", Check.BAD_INPUT),
    ("!(fabs(size - 1.0) <= 1e-3)", "!(fabs(size - 1.0) <= 2e-3)", Check.BAD_INPUT),
    ("!(fabs(lean) <= 1e-3)", "!(fabs(lean) <= 2e-3)", Check.BAD_INPUT),
    ("!(fabs(lean) <= 1e-3)", "!(fabs(lean) <= 0.8e-3)", Check.DRIFTED),
    ("step < 4;", "step < 0;", Check.ROUND_TRIP),
    ("{INFINITY, 0.5, 0.9,", "{INFINITY, 0.5, 0.900004,", Check.LIMITS),
    ("{INFINITY, 0.5,", "{1e9, 0.5,", Check.LIMITS),
    ("jac[3 + i][joint] = 0;", "jac[3 + i][joint] = (gantry_real)1e-4;", Check.JACOBIAN),
    ("0.25, 3.0, 1.0,", "0.25, 3.01, 1.0,", Check.NEAREST),
]
FAULTS = [(TURRET, *row) for row in TURRET_FAULTS] + [(GANTRY, *row) for row in GANTRY_FAULTS]


@pytest.mark.parametrize(("hand", "good", "bad", "check"), FAULTS, ids=lambda value: getattr(value, "name", None))
def test_planted_faults_are_seen(hand: HandWritten, good: str, bad: str, check: Check):
    """The check that is there for it fails, and the report shows one case whole."""
    report = agree(hand.arm, hand.files(fault=(good, bad)), hand.options(), FEW)
    assert report.result(check).failed > 0, to_text(report)
    assert report.result(check).failure is not None
    assert not report.agreed
    assert "does NOT agree" in to_text(report)


def test_the_search_finds_what_a_missing_branch_lacks():
    """With --thorough; a sound inverse lacks nothing."""
    thorough = Settings(samples=100, thorough=2, processes=1)
    right = agree(TURRET.arm, TURRET.files(), TURRET.options(), thorough)
    assert right.result(Check.SEARCH).cases == 8
    assert right.agreed, to_text(right)
    fault = ("const double facing = branch >= 2 ? -1.0 : 1.0", "const double facing = 1.0")
    assert agree(TURRET.arm, TURRET.files(fault=fault), TURRET.options(), thorough).result(Check.SEARCH).failed == 4


def test_branch_numbers_that_change_places_are_seen():
    """Forwards and backwards swapped on one side of the base, in inverse and branch_of alike.

    Each still gives the other back, but a number is no posture any more.
    """
    files = TURRET.files(fault=("branch >= 2 ? -1.0 : 1.0", "(branch >= 2) != (pose->p[1] < 0) ? -1.0 : 1.0"))
    own = "(out < 0.0 ? 2u : 0u)"
    assert own in files["turret_kin.c"]
    swapped = files["turret_kin.c"].replace(own, "((out < 0.0) != (sin((double)q[0]) * out < 0.0) ? 2u : 0u)")
    report = agree(TURRET.arm, {**files, "turret_kin.c": swapped}, TURRET.options(), FEW)
    assert [result.check for result in report.results if result.failed] == [Check.STEADY]


def numeric(files: dict[str, str]) -> dict[str, str]:
    """The same C with a header that says that its inverse is numeric."""
    line = "#define TURRET_BRANCHES 4\n"
    header = files["turret_kin.h"].replace(line, line + "#define TURRET_INVERSE_NUMERIC 1\n")
    return {**files, "turret_kin.h": header}


def test_of_a_numeric_inverse_the_share_found_is_reported():
    """Few lost solutions are told, many fail."""
    report = agree(TURRET.arm, numeric(TURRET.files()), TURRET.options(), FEW)
    assert report.agreed, to_text(report)
    assert report.run.numeric
    assert "known solutions: " in to_text(report)
    assert not report.result(Check.CLOSED).cases
    fault = ("const double facing = branch >= 2 ? -1.0 : 1.0", "const double facing = 1.0")
    half = agree(TURRET.arm, numeric(TURRET.files(fault=fault)), TURRET.options(), FEW)
    assert half.result(Check.KNOWN).failed


def test_a_looser_angle_error_widens_the_budgets_by_what_it_adds():
    """Own functions of 256 units in the last place: six joints, five units each, beside the promise of 2e-6 rad."""
    exact, loose = (budget_of(Options(angle_error=ulps), 6) for ulps in (2, 256))
    assert (exact.share, exact.angle, exact.ulps) == (1e-6, 2e-6, 2)
    assert loose.angle == pytest.approx(2e-6 + 6 * 5 * 254 * 2.0**-24)
    assert budget_of(Options(mathematics=Mathematics.LIBM, angle_error=256), 6) == exact


def test_a_wrong_table_is_seen():
    """The arm file's length differs from the C's in the sixth digit."""
    joints = list(TURRET.arm.joints)
    joints[1] = dataclasses.replace(joints[1], a=joints[1].a * 1_000_005 / 1_000_000)
    arm = dataclasses.replace(TURRET.arm, joints=tuple(joints))
    assert agree(arm, TURRET.files(), TURRET.options(), FEW).result(Check.FORWARD).failed


def test_a_wrong_interface_is_seen_first():
    """Other joints than the arm file's, or another number type than asked for: nothing more is called."""
    short = dataclasses.replace(TURRET.arm, joints=TURRET.arm.joints[:2])
    report = agree(short, TURRET.files(), TURRET.options(), FEW)
    assert [result.check for result in report.results] == [Check.INTERFACE]
    assert not report.agreed
    other = agree(TURRET.arm, TURRET.files(RealType.DOUBLE), TURRET.options(RealType.FLOAT), FEW)
    assert other.result(Check.INTERFACE).failed


def test_the_same_seed_gives_the_same_report_on_any_number_of_processes():
    one, two = (
        agree(TURRET.arm, TURRET.files(), TURRET.options(), Settings(samples=20_000, seed=5, processes=count))
        for count in (1, 2)
    )
    assert one.to_json() == two.to_json()
    other = agree(TURRET.arm, TURRET.files(), TURRET.options(), Settings(samples=20_000, seed=6))
    assert other.to_json() != one.to_json()


def test_json_holds_every_figure_even_of_failures_with_nan():
    """Readable by a strict reader: NaN and infinity are no JSON (RFC 8259, section 6)."""

    def refuse(constant: str):
        raise AssertionError(f"{constant} in the JSON")

    fault = ("    c3 = fmin(1.0, fmax(-1.0, c3));\n", "")
    report = agree(TURRET.arm, TURRET.files(fault=fault), TURRET.options(), FEW)
    content = json.loads(report.to_json(), parse_constant=refuse)
    assert content["agreed"] is False
    assert content["run"]["samples"] == SAMPLES
    finite = next(check for check in content["checks"] if check["check"] == "finite")
    assert finite["failed"] > 0
    assert "seed joints" in finite["failure"]["details"]


def test_text_names_the_worst_case_and_what_repeats_the_run():
    arm = dataclasses.replace(TURRET.arm, length_unit="mm")
    report = agree(arm, TURRET.files(), TURRET.options(), Settings(samples=1000, seed=42))
    text = to_text(report)
    assert "reach 750 mm" in text
    assert " mm " in text.split("worst errors", 1)[1]
    assert "const turret_real q[3] = {" in text
    assert "repeat with --samples 1000 --seed 42" in text


def test_the_worst_case_repeats():
    """The joint values printed for the worst position error of forward kinematics give that error again."""
    from build_checks.agree_bench import Bench
    from build_checks.compile import compiled

    report = agree(TURRET.arm, TURRET.files(), TURRET.options(), FEW)
    worst = report.result(Check.FORWARD).position
    with compiled(TURRET.files(), TURRET.options()) as library:
        bench = Bench(TURRET.arm, library)
        q = np.array([worst.joints])
        packed, _ = bench.c.forward(bench.c.rounded(q))
        assert np.linalg.norm(packed[0, 9:] - bench.reference.forward(q).position) == pytest.approx(
            worst.error, rel=1e-6
        )


def test_progress_counts_to_the_end():
    seen: list[tuple[int, int]] = []
    agree(TURRET.arm, TURRET.files(), TURRET.options(), FEW, progress=lambda done, total: seen.append((done, total)))
    total = len(units(FEW))
    assert seen == [(done, total) for done in range(total + 1)]


def test_c_that_does_not_compile_is_a_failed_check():
    with pytest.raises(CheckFailedError, match="does not compile"):
        agree(TURRET.arm, TURRET.files(fault=("#include <math.h>", "#include <maths.h>")), TURRET.options(), FEW)


def test_c_that_calls_what_nobody_defines_is_a_failed_check():
    fault = ("return (turret_real)atan2(", "double elsewhere(double, double);\n    return (turret_real)elsewhere(")
    with pytest.raises(CheckFailedError, match="cannot be loaded"):
        agree(TURRET.arm, TURRET.files(fault=fault), TURRET.options(), FEW)


def test_c_that_crashes_is_a_failed_check():
    """In a process of its own; the run neither hangs nor dies."""
    crash = "    if (branch == 3) {\n        *(volatile int *)0 = 1;\n    }\n"
    place = "    const double radius = hypot(x, y);\n"
    settings = Settings(samples=20_000, processes=2)
    with pytest.raises(CheckFailedError, match="ended the process"):
        agree(TURRET.arm, TURRET.files(fault=(place, crash + place)), TURRET.options(), settings)


def test_no_compiler_is_said_with_the_remedy(monkeypatch):
    monkeypatch.setenv("CC", "no-such-compiler")
    with pytest.raises(NoCompilerError, match="set CC"):
        agree(TURRET.arm, TURRET.files(), TURRET.options(), FEW)


def test_limits_narrower_than_the_cs_are_seen():
    """The file allows less than the C does."""
    joints = list(TURRET.arm.joints)
    joints[2] = dataclasses.replace(joints[2], limits=(Angle(radians=-2), Angle(radians=2)))
    arm = dataclasses.replace(TURRET.arm, joints=tuple(joints))
    assert agree(arm, TURRET.files(), TURRET.options(), FEW).result(Check.LIMITS).failed
