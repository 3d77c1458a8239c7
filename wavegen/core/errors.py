"""The family of errors: each says where, what, what is allowed and what to do."""

from __future__ import annotations


class WavegenError(Exception):
    """Base of every error that the program raises on purpose.

    Parameters
    ----------
    where : str
        The place: a recipe path, a file name, an option.
    problem : str
        What is wrong there, with value and unit.
    allowed : str
        What would be accepted.
    remedy : str
        One thing to do about it.
    """

    def __init__(self, *, where: str, problem: str, allowed: str, remedy: str) -> None:
        self.where = where
        self.problem = problem
        self.allowed = allowed
        self.remedy = remedy
        super().__init__(where, problem, allowed, remedy)

    def __str__(self) -> str:
        """Build the sentence from the four fields."""
        return f"{self.where}: {self.problem}; allowed: {self.allowed}. {self.remedy}"

    def __reduce__(self) -> tuple[object, ...]:
        """Let the error cross from a worker process with its fields."""
        return (_rebuild, (type(self), self.where, self.problem, self.allowed, self.remedy))


def _rebuild(
    kind: type[WavegenError], where: str, problem: str, allowed: str, remedy: str
) -> WavegenError:
    return kind(where=where, problem=problem, allowed=allowed, remedy=remedy)


class ArgumentsError(WavegenError):
    """An option or argument that cannot be honoured (exit status 2)."""


class RecipeError(WavegenError):
    """A recipe that is missing or wrong (exit status 3)."""


class RecipeFaults(RecipeError):
    """Every complaint about one recipe, in the order of the file.

    Parameters
    ----------
    faults : sequence of RecipeError
        At least one.
    """

    def __init__(self, faults: list[RecipeError] | tuple[RecipeError, ...]) -> None:
        self.faults = tuple(faults)
        first = self.faults[0]
        super().__init__(
            where=first.where,
            problem=first.problem,
            allowed=first.allowed,
            remedy=first.remedy,
        )

    def __str__(self) -> str:
        """One line for each complaint."""
        return "\n".join(str(fault) for fault in self.faults)

    def __reduce__(self) -> tuple[object, ...]:
        """Keep the list when crossing a process border."""
        return (RecipeFaults, (self.faults,))


class SignalError(WavegenError):
    """A signal that cannot be computed or measured (exit status 4)."""


class FileError(WavegenError):
    """A data or output file that cannot be read or written (exit status 4)."""


class TargetMissed(WavegenError):
    """A limit or target that was not met (exit status 5)."""
