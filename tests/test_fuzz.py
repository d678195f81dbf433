"""Short fuzzing runs of the generated C and of the arm file reader, and that each would see a fault."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import pytest
from required_tools import need_packages, need_programs

from build_checks.fuzz import RECORD, FuzzResult, fuzz, random_records, seed_records
from build_checks.fuzz_armfile import fuzz_reader
from build_checks.fuzz_armfile_target import check_outcome
from codegen.armfile import read_arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
EXAMPLES = sorted(ARMS.glob("*.toml"))
RUNS, MORE_RUNS, READER_RUNS = 20_000, 200_000, 3000
SEED = 3

each_real = pytest.mark.parametrize("real", RealType, ids=lambda real: real.c_name)


@cache
def generated(name: str, real: RealType) -> dict[str, str]:
    return generate(read_arm(ARMS / f"{name}.toml").arm, Options(real=real))


def result(name: str, real: RealType, runs: int, fault: tuple[str, str] | None = None) -> FuzzResult:
    need_programs("clang")
    files = dict(generated(name, real))
    if fault:
        assert fault[0] in files["arm_kin.c"], f"arm_kin.c has no {fault[0]!r}"
        files["arm_kin.c"] = files["arm_kin.c"].replace(*fault)
    return fuzz(read_arm(ARMS / f"{name}.toml").arm, files, Options(real=real), runs, seed=SEED)


@each_real
@pytest.mark.parametrize("name", ["bench_six", "vial_picker"])
def test_any_bytes_leave_the_promises_whole(name: str, real: RealType) -> None:
    found = result(name, real, RUNS)
    assert found.failure == ""
    assert found.executions >= RUNS


@pytest.mark.sweep
@each_real
@pytest.mark.parametrize("name", [path.stem for path in EXAMPLES])
def test_any_bytes_leave_the_promises_of_every_arm_whole(name: str, real: RealType) -> None:
    assert result(name, real, MORE_RUNS).failure == ""


FAULTS = [  # what stands in the C, what is put there, what the target says
    ("    if (!arm_all_", "    if (false && !arm_all_", "broken promise"),
    (
        "*work->status = ARM_BAD_BRANCH;",
        "work->found[0][0] = seed[0];\n        *work->status = ARM_BAD_BRANCH;",
        "and the joint values are written",
    ),
    ("if (work->branch >= (unsigned)ARM_BRANCHES)", "if (work->branch > (unsigned)ARM_BRANCHES)", "branch 4 is accepted"),
    ("        ++count;", "        count += branch & 1u;", "inverse_all counts"),
    ("*branch = work.branch;", "*branch = work.branch ^ 1u;", "inverse_nearest"),
]


@pytest.mark.parametrize(("good", "bad", "said"), FAULTS)
def test_a_planted_fault_is_found(good: str, bad: str, said: str) -> None:
    assert said in result("vial_picker", RealType.FLOAT, RUNS, (good, bad)).failure


def test_a_solution_that_misses_is_found() -> None:
    """A length of the link table wrong in the sixth digit, for the inverse only."""
    text = generated("plotter", RealType.FLOAT)["arm_kin.c"]
    name = next(line for line in text.splitlines() if line.startswith("static const arm_real A2"))
    forward = text.index("arm_status arm_forward(")
    assert forward > text.index(name)
    fault = (text[forward:], text[forward:].replace("A2", "(A2 * 1.00001f)", 1))
    assert "misses the point" in result("plotter", RealType.FLOAT, RUNS, fault).failure


def test_records_are_the_same_each_time_and_of_one_length() -> None:
    arm = read_arm(ARMS / "bench_six.toml").arm
    records = [*seed_records(arm, RealType.DOUBLE), *random_records(arm, 50, SEED)]
    assert {len(record) for record in records} == {RECORD}
    assert records == [*seed_records(arm, RealType.DOUBLE), *random_records(arm, 50, SEED)]


def test_any_bytes_give_an_arm_or_a_refusal(tmp_path: Path) -> None:
    need_packages("atheris")
    found = fuzz_reader(EXAMPLES, READER_RUNS, seed=SEED, corpus=tmp_path)
    assert found.failure == ""
    assert found.executions >= READER_RUNS
    assert len(list(tmp_path.iterdir())) > len(EXAMPLES)  # paths through the reader are told apart


def test_a_reader_that_breaks_its_promise_is_found(monkeypatch: pytest.MonkeyPatch) -> None:
    """Whatever else it raises, and a fault that does not name the file."""
    from codegen import armfile
    from codegen.errors import ArmFileError, Fault

    def refuse_without_a_place(_: Path) -> None:
        raise ArmFileError(Fault("somewhere", "wrong"))

    monkeypatch.setattr(armfile, "read_arm", refuse_without_a_place)
    with pytest.raises(AssertionError, match="does not name the file"):
        check_outcome(b"")

    def stumble(_: Path) -> None:
        raise KeyError("arm")

    monkeypatch.setattr(armfile, "read_arm", stumble)
    with pytest.raises(KeyError):
        check_outcome(b"")
