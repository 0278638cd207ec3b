"""Every refusal of the project, as one tree: a message says what is wrong and what to do about it."""

from __future__ import annotations


class EnergytrackError(Exception):
    """Root of all refusals. The command line turns it into one line on stderr and exit status 1."""


class LogbookError(EnergytrackError):
    """The logbook cannot be opened, read or written."""


class EntryError(EnergytrackError):
    """What was typed or imported cannot be an entry of this logbook."""


class UnknownNameError(EnergytrackError):
    """A vehicle, modification or column that does not exist; the message lists those that do."""


class ConsumptionError(EnergytrackError):
    """Entries that cannot be turned into measured consumption."""


class InferenceError(EnergytrackError):
    """A question the log cannot be asked, such as a confidence outside 0 to 1."""


class ReportError(EnergytrackError):
    """A drawing or report that cannot be made or written."""
