"""Each static check stays silent on careful C and speaks up at a planted fault; the faults are one row each."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import pytest
from required_tools import need_programs, need_target

from build_checks.emulate import Call, Input, Output, run
from build_checks.static_checks import CHECKS, static_report
from build_checks.static_compilers import compiler_findings
from build_checks.static_findings import Finding
from build_checks.static_loops import loop_findings
from build_checks.static_misra import DEVIATIONS, deviation_table, misra_findings
from build_checks.static_objects import is_arithmetic, object_findings, stack_figures
from build_checks.static_tidy import tidy_findings
from build_checks.targets import AVR, HOST, M0_PLUS, M4F, RV32, TARGETS, Target

HEADER = """
#ifndef ARM_KIN_H
#define ARM_KIN_H

#ifdef __cplusplus
extern "C" {
#endif

#define ARM_JOINTS 2
#define ARM_BRANCHES 2

typedef float arm_real;

typedef struct arm_pose {
    arm_real r[3][3];
    arm_real p[3];
} arm_pose;

typedef enum arm_status { ARM_OK = 0, ARM_BAD_INPUT } arm_status;

arm_status arm_forward(const arm_real q[ARM_JOINTS], arm_pose *pose);

#ifdef __cplusplus
}
#endif

#endif
"""

CAREFUL = """
#include "arm_kin.h"

static const arm_real A1 = 0.25f; /* m */

static arm_real arm_square(arm_real value)
{
    return value * value;
}

arm_status arm_forward(const arm_real q[ARM_JOINTS], arm_pose *pose)
{
    if (!(arm_square(q[0]) < 4.0f)) {
        return ARM_BAD_INPUT;
    }
    for (unsigned i = 0u; i < 3u; i++) {
        pose->p[i] = A1 * q[0] + q[1];
    }
    return ARM_OK;
}
"""

FILES = {"arm_kin.h": HEADER, "arm_kin.c": CAREFUL}


def with_body(body: str, *, before: str = "") -> dict[str, str]:
    """The careful file with something planted before the loop, and before the function."""
    code = CAREFUL.replace("    for (unsigned i = 0u", f"    {body}\n    for (unsigned i = 0u", 1)
    return {**FILES, "arm_kin.c": code.replace("\narm_status arm_forward", f"\n{before}\narm_status arm_forward", 1)}


def need(check: str) -> None:
    need_programs(*next(row.programs for row in CHECKS if row.name == check))


def test_careful_code_is_clean() -> None:
    for check in CHECKS:
        need(check.name)
    report = static_report(FILES, "arm")
    assert report.findings == ()
    assert report.clean


@dataclass(frozen=True)
class Planted:
    """A fault, and a name of it that the check must give."""

    rule: str
    files: Mapping[str, str]


WARNED = [
    Planted("-Wdouble-promotion", with_body("pose->p[0] = (arm_real)(q[0] * 0.5);")),
    Planted("-Wfloat-equal", with_body("if (q[0] == 1.0f) { return ARM_BAD_INPUT; }")),
    Planted(
        "-Wconversion",
        with_body("const unsigned short n = q[0] > 0.0f; pose->r[0][0] = (arm_real)n; int k = 3; pose->p[1] = k;"),
    ),
    Planted("-Wfloat-conversion", with_body("int k = q[0]; pose->p[1] = (arm_real)k;")),
    Planted("-Wsign-conversion", with_body("int k = -1; unsigned n = k; pose->p[1] = (arm_real)n;")),
    Planted("-Wshadow", with_body("{ const float q = 1.0f; pose->p[0] = q; }")),
    Planted("-Wunused-variable", with_body("int unused;")),
    Planted("-Wcast-qual", with_body("((arm_real *)q)[0] = 1.0f;")),
    Planted(
        "-Wvla",
        with_body("unsigned n = (q[0] > 0.0f) ? 1u : 2u; arm_real room[n]; room[0] = q[0]; pose->p[0] = room[0];"),
    ),
    Planted("-Wundef", with_body("", before="#if ARM_CHECKS\n#endif")),
    Planted("-Wstrict-prototypes", with_body("", before="int arm_old();")),
    Planted("-Wanalyzer-null-dereference", with_body("arm_real *none = 0; if (q[0] > 1.0f) { *none = 1.0f; }")),
    Planted(
        "error",
        with_body("arm_real *room = __builtin_alloca(4); void *any = room; arm_real *back = any; *back = 1.0f;"),
    ),
]


@pytest.mark.parametrize("planted", WARNED, ids=lambda planted: planted.rule)
def test_the_compilers_warn(planted: Planted) -> None:
    need("compilers")
    rules = {finding.rule for finding in compiler_findings(planted.files)}
    assert planted.rule in rules


def test_a_header_must_stand_by_itself() -> None:
    need("compilers")
    header = HEADER.replace("typedef float arm_real;", "typedef float_t arm_real;")
    code = CAREFUL.replace('#include "arm_kin.h"', '#include <math.h>\n#include "arm_kin.h"')
    found = compiler_findings({"arm_kin.h": header, "arm_kin.c": code})
    assert any("float_t" in finding.what and finding.file == "arm_kin.h" for finding in found)


TIDIED = [
    Planted("readability-braces-around-statements", with_body("if (q[0] > 1.0f) return ARM_BAD_INPUT;")),
    Planted("bugprone-branch-clone", with_body("if (q[0] > 1.0f) { pose->p[0] = 1.0f; } else { pose->p[0] = 1.0f; }")),
    Planted("cert-flp30-c", with_body("for (float x = 0.0f; x < 1.0f; x += 0.1f) { pose->p[0] = x; }")),
    Planted(
        "clang-analyzer-core.UndefinedBinaryOperatorResult",
        with_body("float x[2]; x[0] = 1.0f; pose->p[0] = x[0] * x[1];"),
    ),
]


@pytest.mark.parametrize("planted", TIDIED, ids=lambda planted: planted.rule)
def test_clang_tidy_finds(planted: Planted) -> None:
    need("clang-tidy")
    assert any(planted.rule in finding.rule for finding in tidy_findings(planted.files))


MISRA = [  # headlines in MISRA C:2012, numbers as in the table of trade practice; the bodies break them on purpose
    Planted("15.1", with_body("if (q[0] > 1.0f) { goto done; }\n done: ;")),
    Planted("14.1", with_body("for (float x = 0.0f; x < 1.0f; x += 0.1f) { pose->p[0] = x; }")),
    Planted(
        "17.2",
        with_body("", before="static unsigned arm_again(unsigned n) { return (n > 0u) ? arm_again(n - 1u) : 0u; }"),
    ),
    Planted("7.1", with_body("pose->p[0] = (arm_real)017;")),
    Planted("11.4", with_body("pose->p[0] = (arm_real)(unsigned long)pose;")),
    Planted("16.4", with_body("switch (ARM_JOINTS) { case 1: pose->p[0] = 0.0f; break; }")),
]


@pytest.mark.parametrize("planted", MISRA, ids=lambda planted: planted.rule)
def test_a_misra_rule_is_checked(planted: Planted) -> None:
    need("MISRA C:2012")
    assert planted.rule in {finding.rule for finding in misra_findings(planted.files)}


def test_what_is_taken_for_a_false_alarm_hides_no_true_one() -> None:
    need("MISRA C:2012")
    helper = "static arm_real arm_half(arm_real value)\n{\n    return 0.5f * value;\n}\n"
    cast = "const arm_real (*rows)[3];\n    rows = (const arm_real (*)[3])pose->r;\n    pose->p[0] = rows[0][0];"
    constants = "enum {\n    ARM_MARK = 1\n};"
    silent = with_body(f"{cast} pose->p[1] = (arm_real)ARM_MARK;", before=constants)
    assert {"17.7", "2.4"}.isdisjoint(finding.rule for finding in misra_findings(silent))
    planted = with_body(f"{cast}\n    arm_half(q[0]);", before=f"{helper}\nenum arm_tag {{ ARM_MARK = 1 }};")
    assert {"17.7", "2.4"} <= {finding.rule for finding in misra_findings(planted)}


def test_a_file_that_the_checker_cannot_look_into_is_a_finding() -> None:
    need("MISRA C:2012")
    closed = with_body("", before="#if FLT_MANT_DIG != 23\n#error another number type is meant\n#endif")
    assert "was not looked into" in {finding.what for finding in misra_findings(closed)}


def test_every_combination_of_macros_is_checked() -> None:
    need("MISRA C:2012")
    body = "#if defined(__AVR__)\n    goto done;\n#elif defined(__GNUC__)\n    pose->p[0] = (arm_real)017;\n#endif\n done: ;"
    assert {"15.1", "7.1"} <= {finding.rule for finding in misra_findings(with_body(body))}


def test_deviations_are_advisory_or_required_and_listed_with_their_places() -> None:
    """MISRA Compliance:2020: a mandatory guideline cannot be deviated from; here those of MISRA C:2012."""
    need("MISRA C:2012")
    mandatory = {"9.1", "12.5", "13.6", "17.3", "17.4", "17.6", "19.1", "21.13", "21.17", "21.18", "21.19", "21.20"}
    mandatory |= {"22.2", "22.4", "22.5", "22.6"}
    assert mandatory.isdisjoint(deviation.rule for deviation in DEVIATIONS)
    assert all(deviation.reason and deviation.category in ("Advisory", "Required") for deviation in DEVIATIONS)
    table = deviation_table(FILES)
    assert "| Rule 15.5 | Advisory | 1 |" in table
    assert "Rule 8.7" not in table  # a deviation that these files do not need is not listed


LOOPS = [
    Planted("while", with_body("unsigned i = 0u; while (i < 3u) { i++; }")),
    Planted("do", with_body("unsigned i = 0u; do { i++; } while (i < 3u);")),
    Planted("goto", with_body("again: if (pose->p[0] > 1.0f) { pose->p[0] -= 1.0f; goto again; }")),
    Planted("for", with_body("for (unsigned k = 0u; k < (unsigned)q[0]; k++) { pose->p[0] = 0.0f; }")),
    Planted("for", with_body("for (float x = 0.0f; x < 1.0f; x += 0.1f) { pose->p[0] = x; }")),
    Planted("for", with_body("for (unsigned k = 0u; k < 3u; k++) { k = 0u; }")),
    Planted("for", with_body("for (unsigned k = 0u; k < 3u; k++) { unsigned *p = &k; *p = 0u; }")),
    Planted("for", with_body("for (unsigned k = (unsigned)q[0]; k < 3u; k++) { pose->p[0] = 0.0f; }")),
    Planted("for", with_body("for (unsigned k = 0u; k < 3u; k += (unsigned)q[0]) { pose->p[0] = 0.0f; }")),
    Planted("for", with_body("for (int k = 3; k > 0; k -= k) { pose->p[0] = 0.0f; }")),
    Planted("for", with_body("for (int k = 0; (k < 3) || (q[0] > 0.0f); k++) { pose->p[0] = 0.0f; }")),
    Planted("for", with_body("for (int k = 0; k < 3 * k + 1; k++) { pose->p[0] = 0.0f; }")),
    Planted("for", with_body("for (;;) { pose->p[0] += 1.0f; }")),
    Planted("for", with_body("unsigned k; for (k = 0u; k < 3u; k++) { pose->p[0] = 0.0f; }")),
]


@pytest.mark.parametrize("planted", LOOPS, ids=lambda planted: planted.rule)
def test_a_loop_without_a_constant_bound_is_found(planted: Planted) -> None:
    need("loops")
    (finding,) = loop_findings(planted.files)
    line = (
        1
        + planted.files["arm_kin.c"][: planted.files["arm_kin.c"].index("    for (unsigned i = 0u; i < 3u")].count("\n")
        - 1
    )
    assert finding.rule == planted.rule
    assert finding.file == "arm_kin.c"
    assert finding.line == line


BOUNDED = [
    "for (int k = 3; k > 0; k--) { pose->p[0] = 0.0f; }",
    "for (unsigned k = 0u; k < ARM_JOINTS; ++k) { pose->p[k] = 0.0f; }",
    "for (unsigned k = 1u; k <= 2u * ARM_JOINTS - 2u; k += 2u) { pose->p[0] = 0.0f; }",
    "for (int k = 0; (q[0] > 0.0f) && (k < 3); k++) { pose->p[0] = 0.0f; }",
    "for (int k = 0; k < 3; k++) { for (int j = 0; j <= k; j++) { pose->p[0] = 0.0f; } }",
    "for (int k = 0; k < 3; k++) { for (int j = k + 1; j < 3; j++) { pose->p[0] = 0.0f; } }",
    "for (unsigned k = 0u; 3u != k; k++) { pose->p[k] = 0.0f; }",
    "for (unsigned k = 0u; k < sizeof(pose->p) / sizeof(pose->p[0]); k++) { pose->p[k] = 0.0f; }",
    "for (unsigned k = ARM_OK; k < ARM_BAD_INPUT; k++) { for (unsigned j = 0u; j < 3u; j++) { pose->p[k] = 0.0f; } }",
]


@pytest.mark.parametrize("body", BOUNDED)
def test_a_loop_with_a_constant_bound_is_accepted(body: str) -> None:
    need("loops")
    assert loop_findings(with_body(body)) == ()


OBJECT_TARGETS = (HOST, M4F, M0_PLUS, RV32, AVR)
by_name: dict[str, Callable[[Target], str]] = {"ids": lambda target: target.name}


@pytest.mark.parametrize("target", OBJECT_TARGETS, **by_name)
def test_object_code_of_careful_code_is_clean(target: Target) -> None:
    need_target(target)
    assert object_findings(FILES, "arm", target) == ()


OBJECTS = [
    Planted(".data.counter", with_body("counter++;", before="static unsigned counter = 3u;")),
    Planted(".bss.counter", with_body("counter++; pose->p[0] = (arm_real)counter;", before="static unsigned counter;")),
    Planted("sqrtf", with_body("pose->p[0] = sqrtf(q[0]);", before="float sqrtf(float);")),
    Planted("memcpy", with_body("memcpy(pose->p, q, 8);", before="void *memcpy(void *, const void *, __SIZE_TYPE__);")),
]


@pytest.mark.parametrize("planted", OBJECTS[:3], ids=lambda planted: planted.rule)
@pytest.mark.parametrize("target", [HOST], **by_name)
def test_object_code_gives_writable_data_and_foreign_symbols_away(planted: Planted, target: Target) -> None:
    need_target(target)
    assert planted.rule in {finding.rule for finding in object_findings(planted.files, "arm", target)}


RECURSIVE = """
static unsigned arm_odd(unsigned n);
static unsigned arm_even(unsigned n) { return (n == 0u) ? 1u : 1u + arm_odd(n - 1u) * arm_odd(n / 2u); }
static unsigned arm_odd(unsigned n) { return (n == 0u) ? 0u : 3u * arm_even(n - 1u) + 1u; }
"""
INDIRECT = """
static unsigned arm_one(void) { return 1u; }
static unsigned arm_two(void) { return 2u; }
"""


@pytest.mark.parametrize("target", OBJECT_TARGETS, **by_name)
def test_recursion_is_found_in_the_instructions(target: Target) -> None:
    need_target(target)
    planted = with_body("pose->p[0] = (arm_real)arm_even((unsigned)q[0]);", before=RECURSIVE)
    found = [finding for finding in object_findings(planted, "arm", target) if finding.rule == "recursion"]
    assert len(found) == 1
    assert "calls" in found[0].what


@pytest.mark.parametrize("target", OBJECT_TARGETS, **by_name)
def test_a_call_through_a_pointer_is_found_in_the_instructions(target: Target) -> None:
    need_target(target)
    choice = "unsigned (*volatile chosen)(void) = (q[0] > 0.0f) ? arm_one : arm_two;"
    body = f"{choice} pose->p[0] = (arm_real)(chosen() + chosen());"
    found = object_findings(with_body(body, before=INDIRECT), "arm", target)
    assert "indirect call" in {finding.rule for finding in found}


@pytest.mark.parametrize("target", TARGETS, **by_name)
def test_the_computed_stack_holds_what_a_call_really_takes(target: Target) -> None:
    """Painted in the emulator: never more than computed, and not much less, since this code takes its deepest path."""
    need_target(target)
    body = "volatile arm_real room[40]; room[0] = q[0] / q[1]; pose->p[0] = room[0];"
    files = with_body(body)
    (figure,) = stack_figures(files, "arm", target)
    q = b"\x00\x00\x80\x3f\x00\x00\x00\x40"
    (result,) = run(target, files, [Call("arm_forward", (Input(q), Output(48)), target.status_bytes)])
    assert result.stack <= figure.bytes <= result.stack + 48
    assert result.stack >= 160


SYMBOLS = [  # Run-time ABI for the Arm Architecture; GCC Internals, "The GCC low-level runtime library"
    ("__aeabi_fadd", True),
    ("__aeabi_dcmplt", True),
    ("__aeabi_uidivmod", True),
    ("__addsf3", True),
    ("__ltdf2", True),
    ("__fixsfsi", True),
    ("__floatunsidf", True),
    ("__clzsi2", True),
    ("__aeabi_memcpy", False),
    ("__aeabi_memclr4", False),
    ("memset", False),
    ("sqrtf", False),
    ("malloc", False),
    ("__errno", False),
    ("__stack_chk_fail", False),
]


@pytest.mark.parametrize(("symbol", "arithmetic"), SYMBOLS, ids=[row[0] for row in SYMBOLS])
def test_which_symbols_are_the_compilers_arithmetic(symbol: str, arithmetic: bool) -> None:
    assert is_arithmetic(symbol) is arithmetic


def test_a_finding_prints_in_one_line() -> None:
    assert str(Finding("loops", "arm_kin.c", 7, "while", "has no bound")) == "loops: arm_kin.c:7: has no bound [while]"
    assert str(Finding("object code", "", 0, "recursion", "a calls a")) == "object code: a calls a [recursion]"
