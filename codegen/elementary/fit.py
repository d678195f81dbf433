"""Fit every coefficient anew and write `coefficients.py`: `python -m codegen.elementary.fit`."""
