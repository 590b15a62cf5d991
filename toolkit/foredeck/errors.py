"""Every exception of foredeck, in one leaf module.

An error says what came, where, what is allowed, and what to do next. It carries
those parts as data, so that a page, a log or another process can show them, and
it survives pickling on its way back from a worker.
"""

from __future__ import annotations

from typing import Any, ClassVar


class ForedeckError(Exception):
    """Base of all errors that a user of foredeck can mend.

    Parameters
    ----------
    what : str
        What came, in one sentence, with the offending value.
    where : str
        File, line, column, series or period; empty when there is no place.
    allowed : str
        What would have been accepted.
    do : str
        The next step.
    data : Any
        Further facts for programs (the key, the value, the nearest spelling, ...).
    """

    exit_code: ClassVar[int] = 1

    def __init__(self, what: str, *, where: str = "", allowed: str = "", do: str = "", **data: Any) -> None:  # noqa: D107
        super().__init__(what)
        self.what = what
        self.where = where
        self.allowed = allowed
        self.do = do
        self.data = data

    def __str__(self) -> str:  # noqa: D105
        lines = [self.what]
        lines += [f"  {head}: {text}" for head, text in
                  (("where", self.where), ("allowed", self.allowed), ("next", self.do)) if text]
        return "\n".join(lines)

    def __reduce__(self) -> tuple[Any, ...]:  # noqa: D105
        return _rebuild, (type(self), self.what, self.where, self.allowed, self.do, self.data)


def _rebuild(kind: type[ForedeckError], what: str, where: str, allowed: str, do: str,
             data: dict[str, Any]) -> ForedeckError:
    return kind(what, where=where, allowed=allowed, do=do, **data)


class SettingsError(ForedeckError):
    """The settings file, or a call's arguments, ask for something that is not allowed."""

    exit_code = 2


class IntakeError(ForedeckError):
    """A source could not be read, or read in only one way."""

    exit_code = 3


class PeriodError(IntakeError):
    """A date or period could not be understood, or not in one way only."""


class ShapeError(ForedeckError, ValueError):
    """Arrays or tables that belong together do not fit."""


class MethodError(ForedeckError, ValueError):
    """A method is unknown, or cannot be used on this series."""


class LedgerError(ForedeckError):
    """The ledger cannot be opened, or would be harmed by what was asked."""

    exit_code = 5


class LedgerBusyError(LedgerError):
    """Another process is writing to the ledger."""


class RoundStateError(LedgerError):
    """A round is not in a state that permits what was asked."""


class AdjustmentError(ForedeckError):
    """An adjustment cannot be applied; the row is named."""

    exit_code = 3


class ReportError(ForedeckError):
    """A notebook failed, or a page lacks something it must hold."""

    exit_code = 6
