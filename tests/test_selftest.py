"""The self-test for the board: golden vectors right, C clean, passes on every target, and sees damage."""

from __future__ import annotations

import struct
import tempfile
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from command_line import PLOTTER, call
from required_tools import need_programs, need_target

from build_checks.emulate import Call, Output, run
from build_checks.emulate_contract import read_interface
from build_checks.emulate_image import compile_objects, link_image
from build_checks.reference import Reference
from build_checks.reference_task import TaskReading
from build_checks.static_compilers import compiler_findings
from build_checks.static_loops import loop_findings
from build_checks.static_objects import object_findings
from build_checks.targets import AVR, HOST, M0_PLUS, M3, M4F, M7, RV32, Target
from codegen.armfile import read_arm
from codegen.emit.files import Source
from codegen.golden import GoldenVector, golden_vectors
from codegen.options import Options, RealType
from codegen.pipeline import generate
from codegen.selftest import is_numeric, selftest_files

ARMS = Path(__file__).parents[1] / "arms"
NAMES = tuple(sorted(path.stem for path in ARMS.glob("*.toml")))
FEW = ("bench_six", "tray_scara", "vial_picker")
MORE = tuple(name for name in NAMES if name not in FEW)
SIZE = 8
TINY = 3

each_real = pytest.mark.parametrize("real", RealType, ids=lambda real: real.c_name)
CASES = [(target, real) for target in (M4F, M7, M3, M0_PLUS, RV32) for real in RealType]
CASES += [(AVR, RealType.FLOAT)]  # its double is a float
each_case = pytest.mark.parametrize(
    ("target", "real"), CASES, ids=[f"{target.name}-{real.c_name}" for target, real in CASES]
)


@cache
def files_of(name: str, real: RealType, size: int = SIZE, prefix: str = "arm") -> dict[str, str]:
    arm, options = read_arm(ARMS / f"{name}.toml").arm, Options(real=real, prefix=prefix)
    files = generate(arm, options)
    numeric = is_numeric(files, prefix)
    return {**files, **selftest_files(arm, options, Source(f"{name}.toml"), size, numeric=numeric)}


@cache
def vectors_of(name: str) -> tuple[GoldenVector, ...]:
    return golden_vectors(read_arm(ARMS / f"{name}.toml").arm, SIZE)


def outcome(files: dict[str, str], target: Target, real: RealType, prefix: str = "arm") -> tuple[int, float]:
    """What the function returned, and the largest deviation."""
    need_target(target)
    bytes_of_real = 4 if real is RealType.FLOAT else 8
    returned = 2 if target is AVR else 4
    calls = [Call(f"{prefix}_kin_selftest", (Output(bytes_of_real),), returned)]
    (result,) = run(target, files, calls, count=False)
    (largest,) = struct.unpack("<f" if bytes_of_real == 4 else "<d", result.outputs[0])
    return result.value, largest


@pytest.mark.parametrize("name", NAMES)
def test_golden_poses_are_the_link_tables(name: str) -> None:
    """Against the checker's own product of link matrices in float64, to its rounding."""
    reference = Reference(read_arm(ARMS / f"{name}.toml").arm)
    vectors = vectors_of(name)
    assert len({vector.joints for vector in vectors}) == SIZE
    poses = reference.forward(np.array([[float(q) for q in vector.joints] for vector in vectors]))
    wanted = np.array([[float(entry) for entry in (*vector.rotation, *vector.position)] for vector in vectors])
    found = np.concatenate((poses.rotation.reshape(-1, 9), poses.position), axis=1)
    assert np.abs(found - wanted).max() < 1e-14 * max(1.0, reference.reach)


@pytest.mark.parametrize("name", NAMES)
def test_golden_joint_values_are_within_limits_and_well_posed(name: str) -> None:
    """The sharpness is a lower bound of the smallest singular value that the checker's task Jacobian has."""
    reference = Reference(read_arm(ARMS / f"{name}.toml").arm)
    joints = np.array([[float(q) for q in vector.joints] for vector in vectors_of(name)])
    assert ((joints > reference.lower) & (joints < reference.upper)).all()
    assert (joints.astype(np.float32) == joints).all()
    sharpness = np.array([float(vector.sharpness) for vector in vectors_of(name)])
    smallest = TaskReading(reference).smallest_singular(joints)
    assert (sharpness <= smallest * (1 + 1e-9)).all()
    assert sharpness.min() > 0.03


@each_real
@pytest.mark.parametrize("name", NAMES)
def test_passes_on_this_machine(name: str, real: RealType) -> None:
    number, largest = outcome(files_of(name, real), HOST, real)
    assert (number, 0.0 < largest < 1.0) == (0, True), largest


@each_case
@pytest.mark.parametrize("name", FEW)
def test_passes_on_the_targets(name: str, target: Target, real: RealType) -> None:
    assert outcome(files_of(name, real), target, real) == outcome(files_of(name, real), HOST, real)


@pytest.mark.sweep
@each_case
@pytest.mark.parametrize("name", MORE)
def test_other_arms_pass_on_the_targets(name: str, target: Target, real: RealType) -> None:
    assert outcome(files_of(name, real), target, real) == outcome(files_of(name, real), HOST, real)


def damaged(file: str, good: str, bad: str, name: str = "vial_picker") -> dict[str, str]:
    files = dict(files_of(name, RealType.FLOAT))
    assert good in files[file], f"{file} has no {good!r}"
    files[file] = files[file].replace(good, bad, 1)
    return files


DAMAGE = [  # in the C of the arm: what stands there, what is put there
    ("static const arm_real A2 = 0.185f", "static const arm_real A2 = 0.18501f"),
    ("    pose->p[0] = ", "    pose->p[0] = 1e38f * 1e38f * "),
    ("    pose->p[1] = ", "    pose->p[1] = 0.0f / 0.0f * "),
    (
        "arm_status arm_forward(const arm_real q[ARM_JOINTS], arm_pose *pose)\n{",
        "\\g<0>\n    if (q[0] > 0.0f) { return ARM_BAD_INPUT; }",
    ),
    ("] = work->q[0];", "] = work->seed[0];"),
    ("    unsigned branch = 0u;\n", "    unsigned branch = 1u;\n"),
]


@pytest.mark.parametrize(("good", "bad"), DAMAGE)
def test_damaged_c_is_seen(good: str, bad: str) -> None:
    number, largest = outcome(damaged("arm_kin.c", good, bad.replace("\\g<0>", good)), HOST, RealType.FLOAT)
    assert number > 0
    assert largest > 1.0


def test_the_number_is_that_of_the_first_damaged_vector() -> None:
    vector = vectors_of("vial_picker")[TINY - 1]
    good = ", ".join(f"{float(q)!r}f" for q in vector.joints)
    number, _ = outcome(
        damaged("arm_kin_selftest.c", good, good.replace(good, f"0.25f + {good}")), HOST, RealType.FLOAT
    )
    assert number == TINY


def test_a_refusal_counts_as_the_header_says() -> None:
    files = damaged(
        "arm_kin.c", "    pose->p[0] = ", "    if (q[0] > 0.0f) { return ARM_BAD_INPUT; }\n    pose->p[0] = "
    )
    assert "count as 1 000 000" in files["arm_kin_selftest.h"]
    assert outcome(files, HOST, RealType.FLOAT)[1] == 1_000_000


@each_real
@pytest.mark.parametrize("name", FEW)
def test_no_compiler_says_anything(name: str, real: RealType) -> None:
    need_programs("gcc", "g++", "clang", "clang++")
    assert compiler_findings(files_of(name, real)) == ()


@pytest.mark.parametrize("target", [M4F, RV32, AVR], ids=lambda target: target.name)
def test_object_code_has_no_writable_data_and_loops_have_bounds(target: Target) -> None:
    need_target(target)
    need_programs("clang")
    files = files_of("bench_six", RealType.FLOAT)
    calls = {"arm_forward", "arm_inverse", "arm_branch_of"}  # of the arm's own file
    assert [row for row in object_findings(files, "arm", target) if row.rule not in calls] == []
    own = {name: text for name, text in files.items() if name != "arm_kin.c"}
    assert [row for row in loop_findings(own) if "selftest" in row.file] == []


def test_vectors_take_flash_and_no_memory_on_avr() -> None:
    """72 bytes a vector of a six-joint arm: with a vector more, the flash grows by that and the memory not at all."""
    need_target(AVR)

    def sizes(count: int) -> tuple[int, int]:
        from elftools.elf.elffile import ELFFile

        with tempfile.TemporaryDirectory() as folder:
            objects = compile_objects(AVR, files_of("bench_six", RealType.FLOAT, count), Path(folder))
            image = link_image(objects, ["arm_kin_selftest"], "selftest")
            with image.path.open("rb") as stream:
                section = ELFFile(stream).get_section_by_name(".data")
                return image.flash, section["sh_size"] if section else 0

    (small, memory), (large, same_memory) = sizes(TINY), sizes(TINY + 4)
    assert large - small == 4 * 72
    assert memory == same_memory


def test_two_arms_live_in_one_image() -> None:
    left, right = (files_of("vial_picker", RealType.FLOAT, TINY, prefix) for prefix in ("left", "right"))
    for prefix in ("left", "right"):
        assert outcome({**left, **right}, HOST, RealType.FLOAT, prefix)[0] == 0


def test_the_files_are_the_same_each_time_and_say_their_command() -> None:
    arm, options = read_arm(ARMS / "plotter.toml").arm, Options()
    first, second = (selftest_files(arm, options, Source("plotter.toml"), TINY) for _ in range(2))
    assert first == second
    assert "#define ARM_SELFTEST_VECTORS 3u" in first["arm_kin_selftest.h"]
    assert all("linkwright generate plotter.toml" in text and "--self-test-size 3" in text for text in first.values())
    assert read_interface(files_of("plotter", RealType.FLOAT), "arm").joints == 2


def test_the_command_writes_the_self_test_beside_the_c(tmp_path: Path) -> None:
    assert call("generate", PLOTTER, "--out", tmp_path, "--self-test", "--self-test-size", "3").status == 0
    names = {"arm_kin.c", "arm_kin.h", "arm_kin_selftest.c", "arm_kin_selftest.h"}
    assert {path.name for path in tmp_path.iterdir()} == names
    assert "#define ARM_SELFTEST_VECTORS 3u" in (tmp_path / "arm_kin_selftest.h").read_text()


@pytest.mark.parametrize("options", [["--self-test-size", "3"], ["--self-test", "--self-test-size", "0"]])
def test_a_size_that_makes_no_sense_is_refused(options: list[str], tmp_path: Path) -> None:
    done = call("generate", PLOTTER, "--out", tmp_path / "new", *options)
    assert done.status == 2
    assert "error: --self-test-size" in done.err
    assert not (tmp_path / "new").exists()
