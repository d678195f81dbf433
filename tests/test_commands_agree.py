"""`linkwright agree` from the command line: statuses, reports as JSON and JUnit XML, parts of a run joined again."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from xml.etree import ElementTree

import pytest
from command_line import PLOTTER, call, names_in, without_progress

from codegen.emit.files import Source
from codegen.model import Arm
from codegen.options import Options
from codegen.pipeline import generate

FEW = ["--samples", "300"]


@pytest.fixture
def wrong_c(monkeypatch: pytest.MonkeyPatch) -> None:
    """From here on the generated C holds a wrong sign."""

    def with_fault(arm: Arm, options: Options, source: Source | None = None) -> dict[str, str]:
        files = generate(arm, options, source)
        right = "pose->p[0] = "
        assert files["arm_kin.c"].count(right) == 1
        return files | {"arm_kin.c": files["arm_kin.c"].replace(right, "pose->p[0] = -")}

    monkeypatch.setattr("codegen.pipeline.generate", with_fault)


def test_agreement_exits_with_zero_and_prints_the_table_on_standard_output() -> None:
    done = call("agree", PLOTTER, *FEW, "--seed", "5")
    assert (done.status, without_progress(done.err)) == (0, "")
    assert "The C agrees with the link table; repeat with --samples 300 --seed 5." in done.out


@pytest.mark.usefixtures("wrong_c")
def test_a_disagreement_exits_with_one_and_shows_the_failing_case(tmp_path: Path) -> None:
    report, junit = tmp_path / "report.json", tmp_path / "report.xml"
    done = call("agree", PLOTTER, *FEW, "--report", report, "--junit", junit)
    assert done.status == 1
    assert "does NOT agree" in done.out
    assert "joint values: " in done.out
    assert json.loads(report.read_text(encoding="utf-8"))["agreed"] is False
    suite = ElementTree.parse(junit).getroot()[0]
    failed = [case for case in suite.iter("testcase") if case.find("failure") is not None]
    assert len(failed) == int(suite.attrib["failures"]) > 0
    assert "cases failed" in failed[0][0].attrib["message"]
    assert "joint values" in str(failed[0][0].text)


def test_json_for_a_machine_is_all_that_stands_on_standard_output(tmp_path: Path) -> None:
    done = call("agree", PLOTTER, *FEW, "--json", "--report", tmp_path / "report.json")
    content = json.loads(done.out)
    assert content["agreed"] is True
    assert content["run"]["samples"] == 300
    assert done.out == (tmp_path / "report.json").read_text(encoding="utf-8")


def test_the_same_run_writes_the_same_bytes(tmp_path: Path) -> None:
    for name in ("first", "second"):
        call("agree", PLOTTER, *FEW, "--report", tmp_path / f"{name}.json", "--junit", tmp_path / f"{name}.xml")
    assert (tmp_path / "first.json").read_bytes() == (tmp_path / "second.json").read_bytes()
    assert (tmp_path / "first.xml").read_bytes() == (tmp_path / "second.xml").read_bytes()


def test_junit_holds_one_test_for_each_check_of_the_report(tmp_path: Path) -> None:
    done = call("agree", PLOTTER, *FEW, "--json", "--junit", tmp_path / "report.xml")
    suite = ElementTree.parse(tmp_path / "report.xml").getroot()[0]
    names = [case.attrib["name"] for case in suite.iter("testcase")]
    assert names == [check["what"] for check in json.loads(done.out)["checks"]]
    assert (suite.attrib["tests"], suite.attrib["failures"]) == (str(len(names)), "0")


def test_a_thorough_run_searches_for_every_solution() -> None:
    content = json.loads(call("agree", PLOTTER, "--samples", "50", "--thorough", "2", "--json").out)
    assert content["run"]["thorough"] == 2
    (search,) = (row for row in content["checks"] if row["check"] == "search")
    assert search["cases"] > 0


def test_a_report_that_cannot_be_written_loses_nothing(tmp_path: Path) -> None:
    done = call("agree", PLOTTER, *FEW, "--report", tmp_path / "no folder" / "report.json")
    assert done.status == 2
    assert "The C agrees" in done.out
    assert f"error: {tmp_path / 'no folder' / 'report.json'}: cannot be written: No such file or directory" in done.err


def test_without_a_compiler_there_is_one_clear_error(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("CC", "no-such-compiler")
    done = call("agree", PLOTTER)
    assert (done.status, done.out) == (2, "")
    assert "no-such-compiler" in done.err
    assert "hint: install one" in done.err


# --- parts ---


@pytest.fixture
def parts(tmp_path: Path) -> list[Path]:
    paths = [tmp_path / f"part{number}.json" for number in (1, 2, 3)]
    for number, path in enumerate(paths, start=1):
        assert call("agree", PLOTTER, *FEW, "--shard", f"{number}/3", "--report", path).status == 0
    return paths


def test_parts_join_to_the_report_of_the_whole_run(parts: list[Path]) -> None:
    """In any order; every part looks at the interface for itself."""
    joined = json.loads(call("agree", "--merge", *reversed(parts), "--json").out)
    whole = json.loads(call("agree", PLOTTER, *FEW, "--json").out)
    assert joined["run"] == whole["run"]
    assert joined["checks"][0] == whole["checks"][0] | {"cases": 3}
    assert joined["checks"][1:] == whole["checks"][1:]


def test_each_part_does_a_share_of_the_work(parts: list[Path]) -> None:
    whole = {row["check"]: row["cases"] for row in json.loads(call("agree", PLOTTER, *FEW, "--json").out)["checks"]}
    for path in parts:
        rows = json.loads(path.read_text(encoding="utf-8"))["checks"]
        assert sum(row["cases"] for row in rows) < sum(whole.values())


def test_a_failure_in_one_part_fails_the_whole(parts: list[Path]) -> None:
    content = json.loads(parts[1].read_text(encoding="utf-8"))
    content["checks"][-1] |= {"failed": 1, "failure": {"what": "planted", "details": {"joint values": [1.0, 2.0]}}}
    parts[1].write_text(json.dumps(content), encoding="utf-8")
    done = call("agree", "--merge", *parts)
    assert done.status == 1
    assert "planted" in done.out


def test_parts_that_are_missing_repeated_or_foreign_are_refused(parts: list[Path], tmp_path: Path) -> None:
    assert "of 3 parts, these are missing: 2" in call("agree", "--merge", parts[0], parts[2]).err
    assert "given more than once: part 1" in call("agree", "--merge", *parts, parts[0]).err
    foreign = tmp_path / "foreign.json"
    call("agree", PLOTTER, *FEW, "--seed", "2", "--shard", "3/3", "--report", foreign)
    done = call("agree", "--merge", parts[0], parts[1], foreign)
    assert (done.status, done.out) == (2, "")
    assert f"error: {foreign}: is not of the run that {parts[0]} is of" in done.err


def test_parts_of_other_c_are_refused(parts: list[Path]) -> None:
    content = json.loads(parts[2].read_text(encoding="utf-8"))
    content["run"]["c_digest"] = "0" * 64
    parts[2].write_text(json.dumps(content), encoding="utf-8")
    assert call("agree", "--merge", *parts).status == 2


@pytest.mark.parametrize(
    "text", ["", "{}", "[]", "null", '{"run": 3, "checks": []}', '{"run": {}, "checks": {}}', "\0"]
)
def test_what_is_no_report_is_refused(text: str, tmp_path: Path) -> None:
    (tmp_path / "part.json").write_text(text, encoding="utf-8")
    done = call("agree", "--merge", tmp_path / "part.json")
    assert (done.status, done.out) == (2, "")
    assert "is no report of an agreement run" in done.err


def test_a_report_that_is_not_there_is_refused(tmp_path: Path) -> None:
    done = call("agree", "--merge", tmp_path / "part.json")
    assert done.status == 2
    assert "cannot be read: No such file or directory" in done.err


@pytest.mark.parametrize("shard", ["0/3", "4/3", "1", "a/b", "1/0", "-1/3", "1/3/5", "٣/٣"])
def test_a_part_that_is_none_is_refused(shard: str) -> None:
    done = call("agree", PLOTTER, f"--shard={shard}")
    assert (done.status, done.out) == (2, "")
    assert done.err == f'error: --shard: cannot read "{shard}"\n  hint: write i/n, the part from 1 to n: 2/8, say\n'


def test_two_arm_files_are_refused() -> None:
    done = call("agree", PLOTTER, PLOTTER)
    assert done.status == 2
    assert "2 files given, one arm file is accepted" in done.err


# --- long runs ---


def test_an_interrupt_ends_a_run_without_a_traceback_of_the_command(tmp_path: Path) -> None:
    """130 is 128 + SIGINT, as shells count (POSIX.1-2017, Shell and Utilities, 2.8.2)."""
    report = tmp_path / "report.json"
    command = [
        sys.executable,
        "-m",
        "codegen.main",
        "agree",
        str(PLOTTER),
        "--samples",
        "1000000",
        "--report",
        str(report),
    ]
    run = subprocess.Popen(
        command,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        env=os.environ | {"PYTHONUNBUFFERED": "1"},
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),  # some parents ignore it
    )
    assert run.stderr is not None
    deadline = time.monotonic() + 60
    while run.poll() is None and time.monotonic() < deadline and not run.stderr.readline().startswith("checking"):
        pass
    run.send_signal(signal.SIGINT)
    _, err = run.communicate(timeout=60)
    assert run.returncode == 130
    assert "Traceback" not in err
    assert names_in(tmp_path) == []
