"""The same calls on this machine, through a shared library: what the emulated processors are compared with."""

from __future__ import annotations

import ctypes

from build_checks.emulate_image import Image


class HostMachine:
    """This processor; the memory for arguments is one buffer. Nothing is counted."""

    stack = 0

    def __init__(self, image: Image) -> None:
        self.image = image
        self._library = ctypes.CDLL(str(image.path))
        self._buffer = (ctypes.c_uint64 * 8192)()
        start = ctypes.addressof(self._buffer)
        self.memory = range(start, start + ctypes.sizeof(self._buffer))

    def write(self, address: int, data: bytes) -> None:
        ctypes.memmove(address, data, len(data))

    def read(self, address: int, count: int) -> bytes:
        return ctypes.string_at(address, count)

    def count_from_now(self) -> None:
        """Nothing to count."""

    def call(self, function: str, arguments: tuple[int, ...]) -> tuple[int, int, int]:
        entry = getattr(self._library, function)
        entry.restype = ctypes.c_uint32
        entry.argtypes = [ctypes.c_void_p if value in self.memory else ctypes.c_uint for value in arguments]
        return int(entry(*arguments)), 0, 0
