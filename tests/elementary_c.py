"""The elementary functions alone, compiled and callable, for the tests of them."""

from __future__ import annotations

import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import cffi

from build_checks.certify import functions_text
from codegen.options import Arithmetic, Mathematics, Options, RealType

WARNINGS = (
    *("-Werror", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Wsign-conversion", "-Wdouble-promotion"),
    *("-Wshadow", "-Wfloat-equal", "-Wundef", "-Wcast-qual", "-Wvla"),
)
_EXPORTS = """
void call_sin_cos(arm_real angle, arm_real *sine, arm_real *cosine);
arm_real call_sqrt(arm_real x);
arm_real call_abs(arm_real x);
int call_is_finite(arm_real x);
void call_sin_cos(arm_real angle, arm_real *sine, arm_real *cosine) { arm_sin_cos(angle, sine, cosine); }
arm_real call_sqrt(arm_real x) { return arm_sqrt(x); }
arm_real call_abs(arm_real x) { return arm_abs(x); }
int call_is_finite(arm_real x) { return arm_is_finite(x); }
"""
OWN = [Options(), Options(angles=Arithmetic.INTEGER), Options(real=RealType.DOUBLE)]
EVERY = [*OWN, *(Options(real=real, mathematics=Mathematics.LIBM) for real in RealType)]


def named(options: Options) -> str:
    kind = options.angles.value if options.mathematics is Mathematics.OWN else "libm"
    return f"{options.real.c_name}-{kind}"


def source_of(options: Options) -> str:
    """One C file: the functions, and each of the static ones under a name that can be called from outside."""
    return functions_text(options) + _EXPORTS


@dataclass(frozen=True, slots=True)
class Functions:
    """The compiled functions; numbers are rounded to the type on the way in."""

    library: Any
    ffi: cffi.FFI

    def atan2(self, y: float, x: float) -> float:
        return float(self.library.arm_atan2(y, x))

    def sin_cos(self, angle: float) -> tuple[float, float]:
        sine, cosine = self.ffi.new("arm_real *"), self.ffi.new("arm_real *")
        self.library.call_sin_cos(angle, sine, cosine)
        return float(sine[0]), float(cosine[0])

    def sqrt(self, x: float) -> float:
        return float(self.library.call_sqrt(x))

    def abs(self, x: float) -> float:
        return float(self.library.call_abs(x))

    def is_finite(self, x: float) -> int:
        return int(self.library.call_is_finite(x))


@contextmanager
def compiled(options: Options) -> Iterator[Functions]:
    ffi = cffi.FFI()
    ffi.cdef(
        f"typedef {options.real.c_name} arm_real; arm_real arm_atan2(arm_real, arm_real);"
        "void call_sin_cos(arm_real, arm_real *, arm_real *); arm_real call_sqrt(arm_real);"
        "arm_real call_abs(arm_real); int call_is_finite(arm_real);"
    )
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "functions.c"
        path.write_text(source_of(options))
        flags = ["-std=c99", "-O2", "-ffp-contract=off", "-fPIC", "-shared"]
        subprocess.run(["gcc", *flags, str(path), "-o", f"{path}.so", "-lm"], check=True)
        library = ffi.dlopen(f"{path}.so")
        try:
            yield Functions(library, ffi)
        finally:
            ffi.dlclose(library)
