"""What a test does when a tool is not installed: it is skipped, but where every tool must be there it fails."""

from __future__ import annotations

import os
import shutil
from importlib.util import find_spec

import pytest

from build_checks.targets import Target, why_not_measured


def need_target(target: Target) -> None:
    """The target's compiler and emulator."""
    missing = why_not_measured(target)
    if missing:
        _without(missing)


def need_programs(*programs: str) -> None:
    missing = [program for program in programs if shutil.which(program) is None]
    if missing:
        _without(f"not installed: {', '.join(missing)}")


def need_packages(*packages: str) -> None:
    """Python packages that exist for some systems only."""
    missing = [package for package in packages if find_spec(package) is None]
    if missing:
        _without(f"no Python package {', '.join(missing)}")


def _without(reason: str) -> None:
    if os.environ.get("LINKWRIGHT_REQUIRE_TOOLS") == "1":
        pytest.fail(reason)
    pytest.skip(reason)
