"""Faults in what the user gave, and failures that are the program's or the machine's own."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong with a plan, a file of records or a formula.

    `what` says what is wrong, `where` names the file, key, column or row, `remedy` what to do.
    """

    what: str
    where: str
    remedy: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what} {self.remedy}".strip()


class OddsmodelError(Exception):
    """Every error that this package raises on purpose."""


class InputFault(OddsmodelError):
    """The plan, the records or the formula is at fault; carries every fault found together."""

    def __init__(self, faults: Fault | Sequence[Fault]) -> None:
        self.faults: tuple[Fault, ...] = (faults,) if isinstance(faults, Fault) else tuple(faults)
        super().__init__("\n".join(str(fault) for fault in self.faults))

    def __reduce__(self) -> tuple[type[InputFault], tuple[tuple[Fault, ...]]]:
        """Faults that a worker finds are told here as they are."""
        return InputFault, (self.faults,)
