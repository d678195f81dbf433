"""The JSON Schema of the arm file: sound by the published meta-schema, and of one mind with the reader.

The meta-schema and the meaning of every word are those of JSON Schema draft 2020-12 (json-schema.org), as the package
`jsonschema` has them.
"""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

import jsonschema
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from codegen.armfile import read_arm
from codegen.armfile_keys import TABLES
from codegen.errors import ArmFileError
from codegen.schema import arm_file_schema

ARMS = sorted((Path(__file__).parent.parent / "arms").glob("*.toml"))
VALIDATOR = jsonschema.Draft202012Validator(arm_file_schema())
GOOD = """
[arm]
name = "x"
convention = "standard"
task = "plane_point"

[[joint]]
type = "revolute"
a = 1

[[joint]]
type = "revolute"
a = 1
"""


def reader_takes(path: Path, text: str) -> bool:
    path.write_text(text)
    try:
        read_arm(path)
    except ArmFileError:
        return False
    return True


def schema_takes(text: str) -> bool:
    return bool(VALIDATOR.is_valid(tomllib.loads(text)))


def test_the_schema_is_one() -> None:
    jsonschema.Draft202012Validator.check_schema(arm_file_schema())
    assert json.loads(json.dumps(arm_file_schema())) == arm_file_schema()


def test_every_key_is_described() -> None:
    properties = arm_file_schema()["properties"]
    for table in TABLES:
        rows = properties[table.name]
        keys = rows["items"]["properties"] if table.repeated else rows["properties"]
        assert sorted(keys) == sorted(key.name for key in table.keys)
        assert all(value["description"] for value in [rows, *keys.values()])


@pytest.mark.parametrize("path", ARMS, ids=lambda path: path.stem)
def test_a_shipped_arm_is_valid(path: Path) -> None:
    VALIDATOR.validate(tomllib.loads(path.read_text()))


REFUSED = [  # a piece of the good file, what replaces it
    ('name = "x"', 'name = "my arm"'),
    ('name = "x"', 'name = "int"'),
    ('name = "x"', 'name = "__x"'),
    ('name = "x"', 'name = "_X"'),
    ('name = "x"', f'name = "{"x" * 41}"'),
    ('name = "x"', "name = 3"),
    ('name = "x"', ""),
    ('"standard"', '"dh"'),
    ('convention = "standard"', ""),
    ('"plane_point"', '"plane"'),
    ('task = "plane_point"', ""),
    ('task = "plane_point"', 'task = "plane_point"\nlength_unit = "cm"'),
    ('task = "plane_point"', 'task = "plane_point"\nangle_unit = 1'),
    ('task = "plane_point"', 'task = "plane_point"\nheld = "joint1"'),
    ('task = "plane_point"', 'task = "plane_point"\nspare = 1'),
    ("a = 1\n\n", "a = true\n\n"),
    ("a = 1\n\n", 'a = "1"\n\n'),
    ("a = 1\n\n", "a = 1e8\n\n"),
    ("a = 1\n\n", "alpha = -1e8\n\n"),
    ("a = 1\n\n", "limits = [1]\n\n"),
    ("a = 1\n\n", 'limits = [-1, "1"]\n\n'),
    ("a = 1\n\n", "max_speed = 0\n\n"),
    ("a = 1\n\n", 'name = "a*/"\n\n'),
    ("a = 1\n\n", 'name = ""\n\n'),
    ("a = 1\n\n", "aplha = 1\n\n"),
    ('type = "revolute"', ""),
    ('type = "revolute"', 'type = "rotary"'),
    ("[arm]", "[tool]\nxyz = [0, 0]\n[arm]"),
    ("[arm]", "[base]\nrpy = 3\n[arm]"),
    ("[arm]", "[bse]\n[arm]"),
    ("[arm]", "[[tool]]\n[arm]"),
    ("[[joint]]", "[[joints]]"),
]


@pytest.mark.parametrize(("old", "new"), REFUSED)
def test_what_the_schema_refuses_the_reader_refuses(tmp_path: Path, old: str, new: str) -> None:
    assert schema_takes(GOOD)
    assert reader_takes(tmp_path / "arm.toml", GOOD)
    text = GOOD.replace(old, new, 1)
    assert text != GOOD
    assert not schema_takes(text)
    assert not reader_takes(tmp_path / "arm.toml", text)


def test_both_refuse_no_joint_and_eight(tmp_path: Path) -> None:
    head = GOOD.split("[[joint]]")[0]
    for text in (head, head + '[[joint]]\ntype = "revolute"\n' * 8):
        assert not schema_takes(text)
        assert not reader_takes(tmp_path / "arm.toml", text)


VALUES = [
    "-3",
    "0",
    "0.5",
    "1e7",
    "90",
    '"mm"',
    '"deg"',
    '"rad"',
    '"waist"',
    '["waist"]',
    "[]",
    "[-1, 1]",
    "[0, 1, 2]",
    "true",
]
KEYS = sorted({key.name for table in TABLES for key in table.keys})


@settings(max_examples=300, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(path=st.sampled_from(ARMS), line=st.integers(0, 200), key=st.sampled_from(KEYS), value=st.sampled_from(VALUES))
def test_what_the_reader_takes_is_valid(tmp_path: Path, path: Path, line: int, key: str, value: str) -> None:
    lines = path.read_text().split("\n")
    lines[line % len(lines)] = f"{key} = {value}"
    text = "\n".join(lines)
    if reader_takes(tmp_path / "arm.toml", text):
        assert schema_takes(text)
