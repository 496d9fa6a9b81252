"""What can go wrong, and the exit code that says so.

0 done, 1 wrong input, 2 wrong usage, 3 done but checks failed, 4 audit failed, 5 machine trouble,
70 internal error, 130 interrupted.
"""

from __future__ import annotations

from collections.abc import Iterable

from aggregator.problems import Problem, problem_report


class FieldfoldError(Exception):
    """An error the person running the program can act on."""

    exit_code = 70


class InputError(FieldfoldError):
    """The desk's files cannot be used as they are.

    Parameters
    ----------
    problems
        Everything that was found wrong, in all files, at once.
    """

    exit_code = 1

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__(problem_report(self.problems))


class UsageError(FieldfoldError):
    """The command was called in a way that cannot work."""

    exit_code = 2


class MachineError(FieldfoldError):
    """The machine could not do its part: a full disk, a worker that died."""

    exit_code = 5
