"""The exit codes of the command line, and which error leads to which: the one table of both."""

from enum import IntEnum


class Exit(IntEnum):
    """What a command tells the shell."""

    GOOD = 0
    TROUBLE = 1
    WRONG_USE = 2
    SETTINGS = 3
    UNREADABLE = 4
    NOT_FOUND = 5
    DATABASE = 6
    NOT_DELIVERED = 7
    INTERRUPTED = 130


MEANINGS: dict[Exit, str] = {
    Exit.GOOD: "all went well",
    Exit.TROUBLE: "trouble while working",
    Exit.WRONG_USE: "the command line was not understood, or an option has a value it cannot have",
    Exit.SETTINGS: "the settings file is missing or faulty",
    Exit.UNREADABLE: "a source, or the file to be replayed, could not be read",
    Exit.NOT_FOUND: "no such stream, source, outlet, shift or delivery",
    Exit.DATABASE: "the database is missing, busy, damaged, needs migrating or is newer than the program",
    Exit.NOT_DELIVERED: "an outlet did not take what it was sent",
    Exit.INTERRUPTED: "interrupted from the keyboard",
}

# By full name rather than by class, so that reading the table imports none of the packages behind it. The
# nearest ancestor that stands here decides.
_BY_ERROR: dict[str, Exit] = {
    "config.errors.SettingsError": Exit.SETTINGS,
    "detectors.errors.UnusableParameter": Exit.WRONG_USE,
    "service.cli.errors.UnknownName": Exit.NOT_FOUND,
    "service.cli.errors.WrongUse": Exit.WRONG_USE,
    "service.poll.UnknownSource": Exit.NOT_FOUND,
    "service.replay.errors.ReplayError": Exit.UNREADABLE,
    "service.round.calendar.UnusableInterval": Exit.WRONG_USE,
    "service.sources.errors.SourceUnreadable": Exit.UNREADABLE,
    "service.wiring.UnusableThreshold": Exit.SETTINGS,
    "storage.errors.NoSuchRow": Exit.NOT_FOUND,
    "storage.errors.StoreError": Exit.DATABASE,
}

# Bases of errors that write their own sentence for a person; any other error is a fault of the program, and
# its traceback is shown.
_OWN_SENTENCES = (*_BY_ERROR, "detectors.errors.DetectorError", "service.cli.errors.CommandError")


def named_errors() -> tuple[str, ...]:
    """Full names of the error classes that are named here."""
    return _OWN_SENTENCES


def code_for(error: BaseException) -> Exit:
    """The exit code of an error: that of its nearest ancestor in the table."""
    for name in _lineage(error):
        if name in _BY_ERROR:
            return _BY_ERROR[name]
    return Exit.INTERRUPTED if isinstance(error, KeyboardInterrupt) else Exit.TROUBLE


def explains_itself(error: BaseException) -> bool:
    """Whether the error's own sentence is enough for a person."""
    return isinstance(error, OSError) or any(name in _OWN_SENTENCES for name in _lineage(error))


def _lineage(error: BaseException) -> list[str]:
    return [f"{kind.__module__}.{kind.__qualname__}" for kind in type(error).__mro__]
