"""Measured errors. Written by `python -m build_checks.certify`: do not edit."""

from codegen.elementary.rows import Figures

FIGURES: tuple[Figures, ...] = ()
