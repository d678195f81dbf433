"""Whatever stands in a file, the reader gives an arm or says what is wrong: no other exception, no hang."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from codegen.armfile import ArmFile, read_arm
from codegen.errors import ArmFileError

SETTINGS = settings(max_examples=150, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
ARMS = sorted((Path(__file__).parent.parent / "arms").glob("*.toml"))
GOOD = [path.read_bytes() for path in ARMS]
VALUES = [
    "nan", "-inf", "1e400", "1e999999999", "-1e-999999999", "0x" + "f" * 900, "true", '"text"', '"\\u0000*/"', "[]",
    "[[[]]]", "{}", "{a = {b = 1}}", "1979-05-27T07:32:00Z", "07:32:00", "-0.0", "0", "1", "1.5708", "180", '"pose"',
    "[0, 0, 0]", "[1, -1]", '["waist"]', "[nan, 1]", "9" * 400,
]  # fmt: skip
KEYS = [
    "name",
    "convention",
    "length_unit",
    "angle_unit",
    "task",
    "held",
    "xyz",
    "rpy",
    "type",
    "a",
    "alpha",
    "d",
    "theta",
]


@pytest.fixture(scope="module")
def file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("fuzz") / "arm.toml"


def check(path: Path, content: bytes) -> None:
    path.write_bytes(content)
    result = outcome(path)
    if isinstance(result, ArmFile):
        assert 1 <= len(result.arm.joints) <= 7
        assert len(result.arm.free_indices) == result.arm.task.joints
    else:
        assert result.faults
        assert all(fault.where.startswith(str(path)) and fault.what for fault in result.faults)
        assert str(result).replace("\n", "").isprintable()


def outcome(path: Path) -> ArmFile | ArmFileError:
    try:
        return read_arm(path)
    except ArmFileError as error:
        return error


@SETTINGS
@given(content=st.binary(max_size=200))
def test_arbitrary_bytes(file: Path, content: bytes) -> None:
    check(file, content)


@SETTINGS
@given(content=st.text(alphabet="[]{}=\"'\\#.,\n \tabj01eE+-_naif", max_size=80))
def test_text_that_resembles_toml(file: Path, content: str) -> None:
    check(file, content.encode())


@SETTINGS
@given(good=st.sampled_from(GOOD), place=st.integers(0, 2000), length=st.integers(0, 30), new=st.binary(max_size=8))
def test_a_good_file_with_a_piece_replaced(file: Path, good: bytes, place: int, length: int, new: bytes) -> None:
    start = place % len(good)
    check(file, good[:start] + new + good[start + length :])


@SETTINGS
@given(
    good=st.sampled_from(GOOD),
    line=st.integers(0, 500),
    key=st.sampled_from([*KEYS, "limits", "max_speed", "joint", "arm", "tool"]),
    value=st.sampled_from(VALUES),
)
def test_a_good_file_with_a_line_replaced(file: Path, good: bytes, line: int, key: str, value: str) -> None:
    lines = good.decode().split("\n")
    lines[line % len(lines)] = f"{key} = {value}"
    check(file, "\n".join(lines).encode())


def test_a_piece_replaced_reaches_good_and_faulty_files(file: Path) -> None:
    """The property above is not empty: a changed comment still reads, a changed bracket does not."""
    check(file, GOOD[0].replace(b"# ", b"## ", 1))
    file.write_bytes(GOOD[0].replace(b"[arm]", b"[arm", 1))
    with pytest.raises(ArmFileError):
        read_arm(file)
