"""AVR functions in the simavr library: called by address, every cycle counted."""

from __future__ import annotations

from ctypes import byref, c_uint8, c_uint64

from build_checks.emulate_image import Image
from build_checks.emulate_native import avr_library
from codegen.errors import CheckFailedError, Fault

_DATA_BASE = 0x0080_0000  # where the toolchain puts data memory in its one address space
_LIMIT = 100_000_000  # instructions, for a program that never returns
_FIRST_ARGUMENT = 24  # register; each later one two lower


class SimavrMachine:
    """One processor with an image in its memory."""

    def __init__(self, image: Image) -> None:
        self.image = image
        self._library = avr_library()
        self._avr = self._library.avr_open(image.target.core.encode())
        if not self._avr:
            raise CheckFailedError(Fault(image.target.title, f"the simulator has no {image.target.core}"))
        self.stack = self._library.avr_memory_bytes(self._avr)
        self.memory = range(0x1000, 0x1800)  # for arguments, between the constants below and the stack above
        for segment in image.segments:
            self._load(segment.address, segment.data)

    def __del__(self) -> None:
        if getattr(self, "_avr", None):
            self._library.avr_close(self._avr)

    def _load(self, address: int, data: bytes) -> None:
        if address >= _DATA_BASE:
            self.write(address - _DATA_BASE, data)
        else:
            self._library.avr_flash(self._avr, address, data, len(data))

    def write(self, address: int, data: bytes) -> None:
        self._library.avr_poke(self._avr, address, data, len(data))

    def read(self, address: int, count: int) -> bytes:
        buffer = (c_uint8 * count)()
        self._library.avr_peek(self._avr, address, buffer, count)
        return bytes(buffer)

    def count_from_now(self) -> None:
        """Counting costs nothing here: it is always on."""

    def call(self, function: str, arguments: tuple[int, ...]) -> tuple[int, int, int]:
        """Result register (16 bits), instructions, cycles."""
        for place, value in enumerate(arguments):
            self.write(_FIRST_ARGUMENT - 2 * place, value.to_bytes(2, "little"))
        instructions, cycles = c_uint64(), c_uint64()
        entry = self.image.symbols[function]
        failed = self._library.avr_call(self._avr, entry, self.stack - 1, _LIMIT, byref(instructions), byref(cycles))
        if failed:
            what = "did not return" if failed == 1 else "crashed the emulated processor"
            raise CheckFailedError(Fault(f"{self.image.target.title}: {function}", what))
        return int.from_bytes(self.read(_FIRST_ARGUMENT, 2), "little"), instructions.value, cycles.value
