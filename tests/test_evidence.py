"""The evidence beside the C: complete, true, and the same bytes each time."""

from __future__ import annotations

import hashlib
import json
import re
import subprocess
import sys
from importlib.metadata import version
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from command_line import PLOTTER, call
from required_tools import need_programs

from build_checks.agree import Settings, agree
from build_checks.reference import Reference
from build_checks.static_loops import loop_findings
from build_checks.static_misra import DEVIATIONS, cppcheck_findings
from codegen.armfile import read_arm
from codegen.commands.evidence import SEED, evidence_files
from codegen.emit.files import Source
from codegen.errors import CheckFailedError
from codegen.evidence import Loop, loops_of
from codegen.evidence.deviations import DeviationUse, deviation_file
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
NAME = "vial_picker"
SAMPLES = 300


@pytest.fixture(scope="module")
def generated() -> dict[str, str]:
    file = read_arm(ARMS / f"{NAME}.toml")
    return generate(file.arm, Options(), Source(f"{NAME}.toml", file.digest))


@pytest.fixture(scope="module")
def evidence(generated: dict[str, str]) -> dict[str, str]:
    need_programs("cppcheck")
    file = read_arm(ARMS / f"{NAME}.toml")
    return evidence_files(file.arm, Options(), Source(f"{NAME}.toml", file.digest), generated, samples=SAMPLES)


@pytest.fixture(scope="module")
def content(evidence: dict[str, str]) -> dict[str, Any]:
    found: dict[str, Any] = json.loads(evidence["arm_kin.evidence.json"])
    return found


def test_digests_are_those_of_the_files(content: dict[str, Any], generated: dict[str, str]) -> None:
    """SHA-256 by Python's hashlib."""
    assert content["arm_file"]["sha256"] == hashlib.sha256((ARMS / f"{NAME}.toml").read_bytes()).hexdigest()
    digests = {row["name"]: row["sha256"] for row in content["files"]}
    assert digests == {name: hashlib.sha256(text.encode()).hexdigest() for name, text in generated.items()}


def test_command_and_versions(content: dict[str, Any], generated: dict[str, str]) -> None:
    assert content["command"] in generated["arm_kin.c"]
    assert content["versions"]["mpmath"] == version("mpmath")
    assert content["versions"]["numpy"] == version("numpy")
    assert re.search(r"\d+\.\d+", content["versions"]["C compiler"])
    assert content["versions"]["cppcheck"].startswith("Cppcheck ")


def test_agreement_is_the_report_of_agree(content: dict[str, Any], generated: dict[str, str]) -> None:
    arm = read_arm(ARMS / f"{NAME}.toml").arm
    report = agree(arm, generated, Options(), Settings(SAMPLES, SEED))
    assert content["agreement"] == json.loads(report.to_json())
    assert content["agreement"]["agreed"] is True


def test_golden_vectors_are_the_link_tables(content: dict[str, Any]) -> None:
    """Against the checker's product of link matrices, to half a last place of a float."""
    vectors = content["golden_vectors"]
    reference = Reference(read_arm(ARMS / f"{NAME}.toml").arm)
    poses = reference.forward(np.array([vector["joints"] for vector in vectors]))
    assert np.abs(poses.rotation - np.array([vector["rotation"] for vector in vectors])).max() <= 2**-25
    assert np.abs(poses.position - np.array([vector["position"] for vector in vectors])).max() <= 2**-25


def test_stack_and_operations_are_there_for_every_function(content: dict[str, Any]) -> None:
    measured = content["stack"]["bytes"]
    assert measured or content["stack"]["not_measured"]
    for functions in measured.values():
        assert {"arm_forward", "arm_inverse", "arm_inverse_all", "arm_jacobian"} <= functions.keys()
        assert all(size > 0 for size in functions.values())
    assert content["operations"]["forward"]["sine_cosine_pairs"] == 4
    assert content["operations"]["inverse, one branch"]["arc_tangents"] == 4


def test_every_loop_is_listed_with_its_passes(content: dict[str, Any], generated: dict[str, str]) -> None:
    """As many as the compiler's syntax tree has, each with a bound."""
    loops = content["loops"]
    text = generated["arm_kin.c"]
    assert len(loops) == len(re.findall(r"^\s*for \(", text, re.M)) > 3
    assert all(loop["passes"] >= 1 and f"{loop['function']}(" in text for loop in loops)
    need_programs("clang")
    assert loop_findings(generated) == ()


def test_passes_of_loops() -> None:
    text = """static int arm_one(int x)
{
    for (unsigned i = 0u; i < ARM_JOINTS; ++i) {
        for (int j = 1; j <= i; ++j) {
    while (x > 0) {
    for (unsigned k = 1u; (k < (unsigned)ARM_JOINTS) && (x > 0); ++k) {
"""
    files = {"arm_kin.c": text, "arm_kin.h": "#define ARM_JOINTS   6\n"}
    heads = ["for (unsigned i = 0u; i < ARM_JOINTS; ++i)", "for (int j = 1; j <= i; ++j)", "while ("]
    heads.append("for (unsigned k = 1u; (k < (unsigned)ARM_JOINTS) && (x > 0); ++k)")
    assert loops_of(files, "arm") == tuple(
        Loop("arm_one", line, head, passes) for line, head, passes in zip((3, 4, 5, 6), heads, (6, 5, None, 5), strict=True)
    )


def test_the_deviation_table_is_that_of_the_checker(
    generated: dict[str, str], evidence: dict[str, str], content: dict[str, Any]
) -> None:
    """Every rule that the checker finds in the C has a row with its count, or stands among the findings."""
    rules = [row.rule for row in cppcheck_findings(generated) if row.check == "MISRA C:2012"]
    assert {row["rule"] for row in content["misra"]["deviations"]} == set(rules) >= {"12.1", "15.5"}
    reasons = {row.rule: row.reason for row in DEVIATIONS}
    for rule in set(rules) & reasons.keys():
        assert f"| Rule {rule} |" in evidence["arm_kin.misra.md"]
        assert f"| {rules.count(rule)} | {reasons[rule]} |" in evidence["arm_kin.misra.md"]
    assert content["misra"]["findings"] == []
    assert "Findings beyond these deviations: none." in evidence["arm_kin.misra.md"]


def test_findings_beyond_the_deviations_are_said() -> None:
    rows = [DeviationUse("15.5", "Advisory", 3, "returns at once")]
    text = deviation_file("arm_kin.c", "linkwright generate a.toml", "Cppcheck 2.10", rows, ["arm_kin.c:3: rule 10.1"])
    assert "| Rule 15.5 | Advisory | 3 | returns at once |" in text
    assert "- arm_kin.c:3: rule 10.1" in text
    assert "none." not in text


SCRIPT = f"""
import sys
from pathlib import Path
from codegen.armfile import read_arm
from codegen.commands.evidence import evidence_files
from codegen.emit.files import Source
from codegen.options import Options
from codegen.pipeline import generate
file = read_arm(Path(sys.argv[1]))
source = Source("{NAME}.toml", file.digest)
files = generate(file.arm, Options(), source)
sys.stdout.write("".join(evidence_files(file.arm, Options(), source, files, samples={SAMPLES}).values()))
"""


def test_another_process_in_another_folder_writes_the_same_bytes(evidence: dict[str, str], tmp_path: Path) -> None:
    arm = tmp_path / f"{NAME}.toml"
    arm.write_bytes((ARMS / f"{NAME}.toml").read_bytes())
    command = [sys.executable, "-c", SCRIPT, str(arm)]
    done = subprocess.run(command, capture_output=True, text=True, check=True, cwd=tmp_path)
    assert done.stdout == "".join(evidence.values())


def test_no_date_and_no_path(evidence: dict[str, str]) -> None:
    text = "".join(evidence.values())
    assert not re.search(r"20\d\d-\d\d-\d\d|\d\d:\d\d:\d\d", text)
    assert not re.search(r'["\s](/[A-Za-z]\w*)+/', text)
    assert str(Path.home()) not in text


def test_c_that_does_not_agree_gives_no_evidence(generated: dict[str, str]) -> None:
    need_programs("cppcheck")
    wrong = {**generated, "arm_kin.c": generated["arm_kin.c"].replace("A2 = 0.185f", "A2 = 0.1851f")}
    assert wrong != generated
    with pytest.raises(CheckFailedError, match="there is no evidence"):
        evidence_files(read_arm(ARMS / f"{NAME}.toml").arm, Options(), Source("a.toml"), wrong, samples=SAMPLES)


@pytest.mark.parametrize("options", [Options(real=RealType.DOUBLE), Options(mathematics=Mathematics.LIBM)])
def test_other_options(options: Options) -> None:
    need_programs("cppcheck")
    arm = read_arm(ARMS / "plotter.toml").arm
    files = evidence_files(arm, options, Source("plotter.toml"), generate(arm, options), samples=SAMPLES)
    found = json.loads(files["arm_kin.evidence.json"])
    own = options.mathematics is Mathematics.OWN
    assert found["mathematics"]["source"] == ("own" if own else "the compiler's library")
    assert "AVR ATmega2560" not in found["stack"]["bytes"]  # its double is a float; the library's stack is its own
    assert own or len(found["stack"]["not_measured"]) == 1


def test_the_command_writes_the_evidence_beside_the_c(tmp_path: Path) -> None:
    need_programs("cppcheck")
    assert call("generate", PLOTTER, "--out", tmp_path, "--evidence").status == 0
    names = {"arm_kin.c", "arm_kin.h", "arm_kin.evidence.json", "arm_kin.misra.md"}
    assert {path.name for path in tmp_path.iterdir()} == names
    digest = hashlib.sha256((tmp_path / "arm_kin.c").read_bytes()).hexdigest()
    assert digest in (tmp_path / "arm_kin.evidence.json").read_text()
