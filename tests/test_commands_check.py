"""`linkwright check`: the arm as the file has it, its task, how it is solved, and what looks doubtful."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

import pytest
from command_line import CANNOT_REACH, PICKER, PLOTTER, call, names_in

from codegen.places import ARMS


@pytest.mark.parametrize("arm", sorted(ARMS.glob("*.toml")), ids=lambda path: path.stem)
def test_the_arm_is_shown_as_its_file_has_it(arm: Path) -> None:
    """Read with the standard library's own TOML reader; numbers in the units of the file."""
    done = call("check", arm, "--json")
    shown = json.loads(done.out)
    typed = tomllib.loads(arm.read_text(encoding="utf-8"))
    assert done.status == 0
    assert shown["solved"] is True
    assert shown["arm"]["name"] == typed["arm"]["name"]
    assert shown["arm"]["task"]["name"] == typed["arm"]["task"]
    assert shown["arm"]["held"] == typed["arm"].get("held", [])
    for number, (row, joint) in enumerate(zip(shown["arm"]["joints"], typed["joint"], strict=True), start=1):
        assert row["name"] == joint.get("name", f"joint{number}")
        assert row["type"] == joint["type"]
        assert row["limits"] == joint.get("limits")
        assert row["max_speed"] == joint.get("max_speed")
        assert [row[key] for key in ("a", "alpha", "d", "theta")] == [
            pytest.approx(joint.get(key, 0), rel=1e-15) for key in ("a", "alpha", "d", "theta")
        ]
    for table in ("base", "tool"):
        for key in ("xyz", "rpy"):
            assert shown["arm"][table][key] == pytest.approx(typed.get(table, {}).get(key, [0, 0, 0]), rel=1e-15)


def test_the_text_tells_the_task_the_table_and_the_structure() -> None:
    done = call("check", ARMS / "bench_six.toml")
    assert done.status == 0
    assert "task pose: position and orientation\n" in done.out
    assert "needs 6 joints not held and has 6\n" in done.out
    assert "inverse: closed form, 8 branches\n" in done.out
    assert "the axes of flange, forearm_roll, wrist_bend meet in one point" in done.out
    waist = next(line for line in done.out.splitlines() if line.startswith("1  waist"))
    assert waist.split() == ["1", "waist", "revolute", "45", "-90", "310", "0", "-170", "to", "170", "150"]


def test_a_held_joint_is_marked() -> None:
    done = call("check", ARMS / "seven_held.toml")
    (held,) = json.loads(call("check", ARMS / "seven_held.toml", "--json").out)["arm"]["held"]
    (line,) = (line for line in done.out.splitlines() if line.endswith("held") and line[0].isdigit())
    assert line.split()[1] == held


def test_warnings_and_doubts_come_with_advice_on_standard_error(tmp_path: Path) -> None:
    doubtful = tmp_path / "doubtful.toml"
    text = PICKER.read_text(encoding="utf-8").replace("alpha = 90", "alpha = 90.02").replace('"mm"', '"m"')
    doubtful.write_text(text, encoding="utf-8")
    done = call("check", doubtful)
    assert "warning: " in done.err
    assert 'doubt: joint 1 ("waist"): alpha = 90.02 deg is 0.02 deg from a multiple of 90 deg\n  hint: ' in done.err
    as_json = json.loads(call("check", doubtful, "--json").out)
    assert as_json["doubts"][0]["where"] == 'joint 1 ("waist")'
    assert as_json["warnings"][0]["hint"]


def test_an_arm_without_a_solution_exits_with_one_and_says_why(tmp_path: Path) -> None:
    (tmp_path / "flat.toml").write_text(CANNOT_REACH, encoding="utf-8")
    done = call("check", tmp_path / "flat.toml")
    assert done.status == 1
    assert "inverse: cannot be solved\n" in done.out
    assert "error: " in done.err
    as_json = json.loads(call("check", tmp_path / "flat.toml", "--json").out)
    assert as_json["solved"] is False
    assert as_json["inverse"]["reasons"]


def test_a_faulty_file_exits_with_two_and_lists_its_faults_for_a_machine_too(tmp_path: Path) -> None:
    (tmp_path / "faulty.toml").write_text('[arm]\nname = "x"\n', encoding="utf-8")
    done = call("check", tmp_path / "faulty.toml", "--json")
    assert done.status == 2
    content = json.loads(done.out)
    assert content["solved"] is False
    assert len(content["faults"]) == done.err.count("error: ") > 2


def test_check_writes_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    call("check", PLOTTER)
    assert names_in(tmp_path) == []
