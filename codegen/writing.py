"""Files on disk, all of a set or none: written beside their places under temporary names, then renamed.

What stood there before is kept aside until the whole set is in place, and put back when anything goes wrong, an
interrupt included. A symbolic link is followed: what it points to is replaced and the link stays. Modes are kept.
"""

from __future__ import annotations

import errno
import os
import secrets
from collections.abc import Iterator, Mapping
from contextlib import ExitStack, contextmanager, suppress
from pathlib import Path

from codegen.errors import CallError, Fault

_NO_RIGHT = "choose another place, or change its access rights"
_FILE_IN_THE_WAY = "a file stands where a folder should be; choose another place"
_HINTS = {
    errno.EACCES: _NO_RIGHT,
    errno.EPERM: _NO_RIGHT,
    errno.EROFS: "choose a place that is not read-only",
    errno.ENOSPC: "free some space, or choose another place; nothing was changed",
    errno.EDQUOT: "your quota is used up; free some space, or choose another place; nothing was changed",
    errno.EISDIR: "a folder stands where the file should be; choose another place",
    errno.ENOTDIR: _FILE_IN_THE_WAY,
    errno.EEXIST: _FILE_IN_THE_WAY,
    errno.ENOENT: "make its folder first, or choose another place",
    errno.ENAMETOOLONG: "choose a shorter name",
}


def write_files(folder: Path, files: Mapping[str, str]) -> None:
    """Puts all files into the folder, which is made with its parents where it is missing.

    Raises CallError, with nothing changed, where that cannot be done.
    """
    with _refusals(folder), ExitStack() as undo:
        for missing in _missing_folders(folder):
            undo.callback(_remove_folder, missing)
            missing.mkdir(exist_ok=True)
        _place({folder / name: text.encode("utf-8") for name, text in files.items()})
        undo.pop_all()


def write_file(path: Path, content: str | bytes) -> None:
    """Puts one file into its place, in a folder that is there. A device or a pipe is written to as it is."""
    data = content if isinstance(content, bytes) else content.encode("utf-8")
    with _refusals(path):
        if path.exists() and not path.is_file() and not path.is_dir():
            path.write_bytes(data)
        else:
            _place({path: data})


@contextmanager
def _refusals(path: Path) -> Iterator[None]:
    """What the operating system refuses, as one line for the user."""
    try:
        yield
    except OSError as error:
        what = f"cannot be written: {error.strerror or error}"
        raise CallError(Fault(str(path), what, _HINTS.get(error.errno or 0, ""))) from None


def _missing_folders(folder: Path) -> list[Path]:
    """The folder and its parents that are not there yet, outermost first."""
    missing: list[Path] = []
    place = Path(os.path.realpath(folder))
    while not place.exists():
        missing.insert(0, place)
        place = place.parent
    if not place.is_dir():
        raise NotADirectoryError(errno.ENOTDIR, os.strerror(errno.ENOTDIR))
    return missing


def _remove_folder(folder: Path) -> None:
    with suppress(OSError):
        folder.rmdir()


def _place(files: Mapping[Path, bytes]) -> None:
    """All files under temporary names first; only when every one is complete do they get their own."""
    with ExitStack() as undo:
        ready = []
        for path, data in files.items():
            target = Path(os.path.realpath(path))
            _check_replaceable(path, target)
            beside = _temporary_name(target)
            undo.callback(_discard, beside)
            _write_new(beside, data, target)
            ready.append((beside, target))
        aside = []
        for beside, target in ready:
            former = _temporary_name(target) if target.exists() else None
            undo.callback(_restore, former, target)
            if former is not None:
                os.replace(target, former)
                aside.append(former)
            os.replace(beside, target)
        undo.pop_all()
    for former in aside:
        _discard(former)


def _check_replaceable(path: Path, target: Path) -> None:
    """A rename would replace a write-protected file, and fail too late on a folder."""
    code = errno.EISDIR if target.is_dir() else 0
    if target.exists() and not os.access(target, os.W_OK):
        code = errno.EACCES
    if code:
        raise CallError(Fault(str(path), f"cannot be written: {os.strerror(code)}", _HINTS[code]))


def _temporary_name(target: Path) -> Path:
    return target.with_name(f".linkwright-{secrets.token_hex(6)}")


def _write_new(beside: Path, data: bytes, target: Path) -> None:
    """With the mode of the file that it is to replace, else with the usual one."""
    descriptor = os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0), 0o666)
    with open(descriptor, "wb") as stream:
        stream.write(data)
    if target.exists():
        beside.chmod(target.stat().st_mode & 0o777)


def _discard(path: Path) -> None:
    with suppress(OSError):
        path.unlink()


def _restore(former: Path | None, target: Path) -> None:
    """Puts back what stood at the target; where nothing stood there, nothing does again."""
    if former is None:
        _discard(target)
    elif former.exists():
        os.replace(former, target)
