"""Files on disk: all of a set or none, whatever the operating system refuses and whenever an interrupt comes."""

from __future__ import annotations

import errno
import os
import resource
import stat
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from command_line import PICKER, call, names_in, without_progress

from codegen.errors import CallError
from codegen.writing import write_file, write_files

OLD = {"a.c": "old a\n", "a.h": "old h\n"}
NEW = {"a.c": "new a\n", "a.h": "new h\n"}


def contents(folder: Path) -> dict[str, str]:
    return {name: (folder / name).read_text(encoding="utf-8") for name in names_in(folder)}


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Holds an older set of the files."""
    write_files(tmp_path / "out", OLD)
    return tmp_path / "out"


def test_missing_folders_are_made_and_older_files_replaced(tmp_path: Path) -> None:
    place = tmp_path / "several" / "new folders, with ä blank and 腕"
    write_files(place, OLD)
    write_files(place, NEW)
    assert contents(place) == NEW


def test_other_files_of_the_folder_stay(folder: Path) -> None:
    (folder / "main.c").write_text("mine\n", encoding="utf-8")
    write_files(folder, NEW)
    assert contents(folder) == {**NEW, "main.c": "mine\n"}


def test_modes_are_the_usual_ones_and_those_of_a_replaced_file_are_kept(folder: Path) -> None:
    (folder / "a.c").chmod(0o640)
    (folder / "usual").touch()
    write_files(folder, NEW | {"b.c": ""})
    assert stat.S_IMODE((folder / "a.c").stat().st_mode) == 0o640
    assert (folder / "b.c").stat().st_mode == (folder / "usual").stat().st_mode


def test_a_link_stays_and_what_it_points_to_is_replaced(folder: Path, tmp_path: Path) -> None:
    (tmp_path / "real.c").write_text("old\n", encoding="utf-8")
    (folder / "a.c").unlink()
    (folder / "a.c").symlink_to(tmp_path / "real.c")
    write_files(folder, NEW)
    assert (folder / "a.c").is_symlink()
    assert (tmp_path / "real.c").read_text(encoding="utf-8") == "new a\n"


def test_a_linked_folder_stays_a_link(folder: Path, tmp_path: Path) -> None:
    (tmp_path / "link").symlink_to(folder, target_is_directory=True)
    (tmp_path / "dangling").symlink_to(tmp_path / "not yet", target_is_directory=True)
    write_files(tmp_path / "link", NEW)
    write_files(tmp_path / "dangling", NEW)
    assert contents(folder) == contents(tmp_path / "not yet") == NEW


# --- what the operating system refuses ---


def refusal(folder: Path, files: dict[str, str]) -> str:
    with pytest.raises(CallError) as caught:
        write_files(folder, files)
    (fault,) = caught.value.faults
    assert fault.where.startswith(str(folder))
    assert fault.hint
    return fault.what


def test_a_file_in_the_place_of_the_folder(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("mine", encoding="utf-8")
    assert refusal(tmp_path / "out", NEW) == "cannot be written: Not a directory"
    assert refusal(tmp_path / "out" / "deeper", NEW) == "cannot be written: Not a directory"
    assert contents(tmp_path) == {"out": "mine"}


def test_a_folder_in_the_place_of_a_file(folder: Path) -> None:
    (folder / "a.h").unlink()
    (folder / "a.h").mkdir()
    assert refusal(folder, NEW) == "cannot be written: Is a directory"
    assert (folder / "a.c").read_text(encoding="utf-8") == "old a\n"
    assert names_in(folder) == ["a.c", "a.h"]


def test_a_name_that_is_too_long(tmp_path: Path) -> None:
    assert refusal(tmp_path / "made" / ("x" * 300), NEW) == "cannot be written: File name too long"
    assert names_in(tmp_path) == []


def test_a_folder_of_the_system_that_nobody_can_write_to() -> None:
    if not Path("/proc/self").exists():
        pytest.skip("needs Linux's /proc")
    assert refusal(Path("/proc/linkwright"), NEW).startswith("cannot be written: ")


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may write everywhere")
def test_a_read_only_folder_and_a_write_protected_file(folder: Path) -> None:
    (folder / "a.h").chmod(0o444)
    assert refusal(folder, NEW) == "cannot be written: Permission denied"
    (folder / "a.h").chmod(0o644)
    folder.chmod(0o555)
    try:
        assert refusal(folder, NEW) == "cannot be written: Permission denied"
        assert contents(folder) == OLD
    finally:
        folder.chmod(0o755)


@pytest.mark.parametrize("code", [errno.EACCES, errno.EROFS, errno.ENOSPC, errno.EDQUOT])
def test_a_file_that_cannot_be_opened(code: int, folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The second of two: the first is already complete beside its place."""
    genuine, opened = os.open, []

    def refusing(path: Any, *rest: Any, **more: Any) -> int:
        opened.append(path)
        if len(opened) == 2:
            raise OSError(code, os.strerror(code), str(path))
        return genuine(path, *rest, **more)

    monkeypatch.setattr("codegen.writing.os.open", refusing)
    assert refusal(folder, NEW) == f"cannot be written: {os.strerror(code)}"
    assert contents(folder) == OLD


def test_a_file_that_the_system_cuts_short_leaves_nothing(tmp_path: Path) -> None:
    """A real limit on the size of files stands for a full disk: both fail while the bytes are written."""
    done = subprocess.run(
        [sys.executable, "-B", "-m", "codegen.main", "generate", str(PICKER), "--out", str(tmp_path / "out")],
        capture_output=True, text=True, check=False,
        preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (8192, 8192)),
    )  # fmt: skip
    assert done.returncode == 2
    assert without_progress(done.stderr) == f"error: {tmp_path / 'out'}: cannot be written: File too large\n"
    assert names_in(tmp_path) == []


def test_a_full_device_is_reported() -> None:
    if not Path("/dev/full").exists():
        pytest.skip("needs Linux's /dev/full")
    with pytest.raises(CallError, match="No space left on device"):
        write_file(Path("/dev/full"), "text\n")


# --- interrupts and failures half way ---


@pytest.mark.parametrize(
    "error", [KeyboardInterrupt(), OSError(errno.EIO, os.strerror(errno.EIO))], ids=["interrupt", "disk"]
)
@pytest.mark.parametrize("older", [OLD, {}, {"a.h": "old h\n"}], ids=["all there", "none there", "one there"])
@pytest.mark.parametrize("call_that_fails", range(1, 5))
def test_whatever_fails_among_the_renames_the_older_set_stands(
    error: BaseException, older: dict[str, str], call_that_fails: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    write_files(tmp_path / "out", older)
    genuine, calls = os.replace, []

    def failing(*arguments: Any) -> None:
        calls.append(arguments)
        if len(calls) == call_that_fails:
            raise error
        genuine(*arguments)

    monkeypatch.setattr("codegen.writing.os.replace", failing)
    renames = len(NEW) + len(older)
    if call_that_fails > renames:
        write_files(tmp_path / "out", NEW)
        assert contents(tmp_path / "out") == NEW
        return
    with pytest.raises((KeyboardInterrupt, CallError)):
        write_files(tmp_path / "out", NEW)
    assert contents(tmp_path / "out") == older


def test_an_interrupt_while_folders_are_new_leaves_none(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(*_: Any) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("codegen.writing.os.replace", interrupted)
    with pytest.raises(KeyboardInterrupt):
        write_files(tmp_path / "some" / "new" / "folder", NEW)
    assert names_in(tmp_path) == []


# --- one file ---


def test_one_file_is_replaced_as_a_whole(tmp_path: Path) -> None:
    write_file(tmp_path / "report ä.json", "old\n")
    write_file(tmp_path / "report ä.json", "new\n")
    assert contents(tmp_path) == {"report ä.json": "new\n"}


def test_one_file_needs_its_folder(tmp_path: Path) -> None:
    with pytest.raises(CallError) as caught:
        write_file(tmp_path / "none" / "report.json", "text\n")
    assert "make its folder first" in str(caught.value)


def test_a_path_with_blanks_and_other_scripts_works_from_end_to_end(tmp_path: Path) -> None:
    place = tmp_path / "Roboter Ärmchen 腕"
    place.mkdir()
    arm = place / "mein arm.toml"
    arm.write_bytes(PICKER.read_bytes())
    done = call("generate", arm, "--out", place / "out")
    assert done.status == 0, done.err
    assert (place / "out" / "arm_kin.c").read_bytes().isascii()
    assert call("stale", arm, "--out", place / "out").status == 0
    assert call("agree", arm, "--samples", "50", "--report", place / "report.json").status == 0
