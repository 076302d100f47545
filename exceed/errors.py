"""Every error a user can meet, the facts it carries, and the exit code it means."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong: where, what, what would be right, what to do next."""

    place: str
    problem: str
    expected: str = ""
    do: str = ""

    def __str__(self) -> str:
        text = f"{self.place}: {self.problem}" if self.place else self.problem
        if self.expected:
            text += f"\n  expected: {self.expected}"
        if self.do:
            text += f"\n  do: {self.do}"
        return text


class ExceedError(Exception):
    """Base of all errors that are the user's to mend. Carries one or more problems; survives pickling."""

    exit_code = 2

    def __init__(self, *problems: Problem) -> None:
        super().__init__(*problems)
        self.problems: tuple[Problem, ...] = problems

    def __str__(self) -> str:
        return "\n".join(str(problem) for problem in self.problems)

    @classmethod
    def one(cls, place: str, problem: str, expected: str = "", do: str = "") -> ExceedError:
        return cls(Problem(place, problem, expected, do))

    @classmethod
    def many(cls, problems: Iterable[Problem]) -> ExceedError:
        return cls(*problems)


class UsageError(ExceedError):
    """A command line that cannot be followed."""


class DocumentError(ExceedError):
    """A YAML file that is wrong; nothing is scanned with it."""


class LogError(ExceedError):
    """One log that cannot be read or assessed; the others go on."""

    exit_code = 3


class OutputError(ExceedError):
    """An output that cannot be written."""
