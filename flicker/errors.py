"""What can go wrong, and the exit status that each leaves."""

from __future__ import annotations

from enum import IntEnum


class ExitStatus(IntEnum):
    """The answer of a command to the shell."""

    DONE = 0  # done; for `check`: every verdict is pass or not applicable
    LIMIT_BROKEN = 1  # `check`: at least one fail
    UNUSABLE_INPUT = 2  # the words or a file are wrong
    UNDECIDED = 3  # `check`: no fail, but at least one undecided
    INTERRUPTED = 130  # stopped at the keyboard


class FlickerError(Exception):
    """Root of all that this package raises on purpose; its text is one plain sentence."""

    exit_status = ExitStatus.UNUSABLE_INPUT


class InputError(FlickerError, ValueError):
    """A value given by the user cannot be right."""


class UnreadableFileError(FlickerError, OSError):
    """A file cannot be read as what it should be."""


class NotMeasurable(FlickerError):
    """
    A sound capture that cannot carry this answer.

    The text says why and the smallest change that would cure it. Reports print it in place of a number;
    it ends a command only where that command has no other answer to give.
    """
