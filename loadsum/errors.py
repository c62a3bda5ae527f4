"""The kinds of fault a user can cause, and the one the machine can."""

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing that is wrong with an input file.

    Parameters
    ----------
    where : str
        Dotted key of the study file (``transformer.ratings_kva[3]``) or place in a file (``east.csv:6``).
    message : str
        What is wrong, what was found, and what to do about it.
    """

    where: str
    message: str

    def __str__(self) -> str:
        return f"{self.where}: {self.message}"


class LoadsumError(Exception):
    """Base of every error whose text is written for the user."""

    exit_status = 1


class InputError(LoadsumError):
    """Faults of the user's input, all of them at once; exit status 2.

    Parameters
    ----------
    source : str
        Name of the file that holds the faults.
    faults : iterable of Fault
        At least one fault.
    """

    exit_status = 2

    def __init__(self, source: str, faults: Iterable[Fault]) -> None:
        self.source = source
        self.faults = tuple(faults)
        if not self.faults:
            raise ValueError("an InputError needs at least one fault")
        super().__init__(source, self.faults)

    def __str__(self) -> str:
        return "\n".join([self.source, *(f"  {fault}" for fault in self.faults)])


class MissingExtraError(LoadsumError):
    """An optional package is needed and not installed; exit status 2, with the line that installs it."""

    exit_status = 2

    def __init__(self, need: str, extra: str) -> None:
        super().__init__(f"{need} needs an optional package: pip install 'loadsum[{extra}]'")


class MachineError(LoadsumError):
    """The machine cannot do what was asked (a library is missing, the disk is full); exit status 1."""
