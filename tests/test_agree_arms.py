"""Every arm file that comes with the tool agrees with its generated C, in float and in double."""

from __future__ import annotations

from pathlib import Path

import pytest

from build_checks.agree import Settings, agree
from build_checks.report_text import to_text
from codegen.armfile import read_arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

ARMS = sorted(Path(__file__).parent.parent.joinpath("arms").glob("*.toml"))


@pytest.mark.parametrize("real", list(RealType), ids=lambda real: real.c_name)
@pytest.mark.parametrize("path", ARMS, ids=lambda path: path.stem)
def test_arm_agrees(path: Path, real: RealType):
    """All checks, on few samples; `linkwright agree` does many more."""
    arm = read_arm(path).arm
    options = Options(real)
    report = agree(arm, generate(arm, options), options, Settings(samples=1500, processes=1))
    assert report.agreed, to_text(report)
