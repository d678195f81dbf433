"""The errors a user can meet: each says where, what and what to do, and carries its exit status (contract, section 3)."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong: where it stands, what was found, how to mend it."""

    where: str
    what: str
    hint: str = ""

    def __str__(self) -> str:
        text = f"{self.where}: {self.what}"
        return f"{text}\n  hint: {self.hint}" if self.hint else text


class LinkwrightError(Exception):
    """Base of every error that is the user's to mend; shown without a traceback."""

    exit_status = 2

    def __init__(self, *faults: Fault) -> None:
        super().__init__("\n".join(str(fault) for fault in faults))
        self.faults = faults

    def __reduce__(self) -> tuple[type[LinkwrightError], tuple[Fault, ...]]:
        """Pickled whole: an exception's own way would turn the faults into the text that is shown."""
        return type(self), self.faults


class ArmFileError(LinkwrightError):
    """The arm file is faulty; holds every fault found in it."""

    exit_status = 2


class CallError(LinkwrightError):
    """The command line asks for something that cannot be done as written."""

    exit_status = 2


class CannotSolveError(LinkwrightError):
    """The arm cannot do its task, or no inverse can be derived for it."""

    exit_status = 1


class CheckFailedError(LinkwrightError):
    """A check ran and found a disagreement."""

    exit_status = 1
