"""The two small C libraries that count inside the emulators, compiled on this machine when first needed.

A count for every basic block or instruction is too slow in Python; everything else about the emulators is.
"""

from __future__ import annotations

import ctypes
import subprocess
import tempfile
from ctypes import CDLL, POINTER, Structure, c_char_p, c_int, c_uint8, c_uint32, c_uint64, c_void_p
from functools import cache
from pathlib import Path

from codegen.errors import CheckFailedError, Fault

_HERE = Path(__file__).parent


class BlockCounts(Structure):
    """The struct block_counts of emulate_counts.c."""

    _fields_ = (
        ("base", c_uint64),
        ("slots", c_uint64),
        ("runs", POINTER(c_uint64)),
        ("jumps", POINTER(c_uint64)),
        ("bytes", POINTER(c_uint32)),
        ("previous", c_uint64),
        ("next", c_uint64),
    )


@cache
def block_counter() -> CDLL:
    """The library with `count_block`."""
    library = _compiled("emulate_counts.c", ())
    library.count_block.argtypes = (c_void_p, c_uint64, c_uint32, POINTER(BlockCounts))
    library.count_block.restype = None
    return library


@cache
def avr_library() -> CDLL:
    """The library with `avr_open` and its companions."""
    library = _compiled("emulate_avr.c", ("-lsimavr",))
    signatures = {
        "avr_open": (c_void_p, (c_char_p,)),
        "avr_close": (None, (c_void_p,)),
        "avr_flash_bytes": (c_uint32, (c_void_p,)),
        "avr_memory_bytes": (c_uint32, (c_void_p,)),
        "avr_flash": (None, (c_void_p, c_uint32, c_char_p, c_uint32)),
        "avr_poke": (None, (c_void_p, c_uint32, c_char_p, c_uint32)),
        "avr_peek": (None, (c_void_p, c_uint32, POINTER(c_uint8), c_uint32)),
        "avr_call": (c_int, (c_void_p, c_uint32, c_uint32, c_uint64, POINTER(c_uint64), POINTER(c_uint64))),
    }
    for name, (result, arguments) in signatures.items():
        function = getattr(library, name)
        function.restype, function.argtypes = result, arguments
    return library


def simavr_is_here() -> bool:
    """Whether the simavr library and its headers are installed, found by compiling against them.

    Only success is remembered (in `avr_library`): what is missing now may be installed, or on the path, at the next call.
    """
    try:
        avr_library()
    except (CheckFailedError, OSError):
        return False
    return True


def _compiled(source: str, libraries: tuple[str, ...]) -> CDLL:
    """The shared library of one C file beside this module; the file on disk goes as soon as it is loaded."""
    with tempfile.TemporaryDirectory() as folder:
        built = Path(folder) / f"{Path(source).stem}.so"
        command = ["gcc", "-std=gnu11", "-O2", "-shared", "-fPIC", str(_HERE / source), "-o", str(built), *libraries]
        run = subprocess.run(command, capture_output=True, text=True, check=False)
        if run.returncode != 0:
            raise CheckFailedError(Fault(source, f"does not compile: {run.stderr.strip()}"))
        return ctypes.CDLL(str(built))
