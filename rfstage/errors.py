"""Every error meant for the user, under one base.

::

    RfstageError                 what the terminal program catches; nothing wider
    ├── OutOfRangeError          an argument lies outside the range where the formula holds
    ├── InputError               one or more values of a job, a file or a command line are wrong
    ├── ImpossibleError          the request is well formed, and no circuit does it
    ├── ConvergenceError         an iteration did not reach its tolerance; nothing is returned
    └── FileError                a file can't be read, or may not be written
"""

from __future__ import annotations


class RfstageError(Exception):
    """Base of every error meant for the user."""


class OutOfRangeError(RfstageError, ValueError):
    """An argument lies outside the range where the formula holds.

    Parameters
    ----------
    name, need, hint : str
        The argument, what is allowed, and a likely fix (may be empty).
    got : object
        What was given.
    """

    def __init__(self, name: str, got: object, need: str, hint: str = "") -> None:
        super().__init__(f"{name} must be {need}; got {got}" + (f" ({hint})" if hint else ""))
        self.name, self.got, self.need, self.hint = name, got, need, hint


class InputError(RfstageError, ValueError):
    """One or more given values are wrong; ``problems`` holds one line for each."""

    def __init__(self, *problems: str) -> None:
        super().__init__("\n".join(problems))
        self.problems = problems


class ImpossibleError(RfstageError, ValueError):
    """No circuit does what is asked; the text says why, and what would work."""


class ConvergenceError(RfstageError, ArithmeticError):
    """An iteration did not reach its tolerance, so there is no result to return."""


class FileError(RfstageError, OSError):
    """A file can't be read as what it should be, or may not be written."""
