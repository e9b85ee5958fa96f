"""What can go wrong with what the user or the machine gave us: one root; bad input is always a list of `Problem`."""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Any, Self

from pydantic_core import PydanticCustomError

LONGEST_VALUE = 60
"""Characters of a refused value that a message repeats, so that a pasted table does not fill the screen."""


@dataclass(frozen=True)
class Problem:
    """One bad input.

    Attributes
    ----------
    place : str
        Where, in the user's words: ``region "deck", edge 3``.
    value : str
        What was found there; empty when something is missing.
    allowed : str
        What is allowed there.
    hint : str
        How to mend it.
    file : str
        The file it was found in; empty for a docket made in Python.
    xy : (float, float) or None
        The spot on the section, m, where there is one.
    spot : str
        The same in the docket's units, once these are known.
    """

    place: str
    value: str
    allowed: str
    hint: str
    file: str = ""
    xy: tuple[float, float] | None = None
    spot: str = ""

    @property
    def at(self) -> str:
        """Return the spot in words, in metres where the docket's units are not known; empty where there is none."""
        return self.spot or ("" if self.xy is None else f"x = {self.xy[0]:.6g} m, y = {self.xy[1]:.6g} m")

    def __str__(self) -> str:
        """Return one readable paragraph."""
        where = ": ".join(part for part in (self.file, self.place) if part)
        found = f" {self.value} is refused." if self.value else ""
        spot = f" At {self.at}." if self.at else ""
        return f"{where}:{found} Allowed: {_ended(self.allowed)} To mend: {_ended(self.hint)}{spot}"


class HeatvouchError(Exception):
    """The root of every error that is not our own bug."""


class DocketError(HeatvouchError):
    """Bad input: all problems of a docket at once.

    Parameters
    ----------
    problems : iterable of Problem
        At least one.
    """

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = tuple(problems)
        if not self.problems:
            raise TypeError("a DocketError needs at least one problem")
        super().__init__("\n".join(str(problem) for problem in self.problems))

    @classmethod
    def single(
        cls, place: str, value: str, allowed: str, hint: str, *, file: str = "", xy: tuple[float, float] | None = None
    ) -> Self:
        """Return the error that holds one problem."""
        return cls((Problem(place, value, allowed, hint, file, xy),))

    def in_file(self, file: str) -> Self:
        """Return the same error with every problem placed in the file of that name."""
        return type(self)(replace(problem, file=file) for problem in self.problems)

    def __reduce__(self) -> tuple[Any, ...]:
        """Let the error cross from a worker process whole."""
        return type(self), (self.problems,)


class SectionError(DocketError):
    """Geometry that has no meaning; each problem shows its spot where it has one."""

    @property
    def xy(self) -> tuple[float, float] | None:
        """The first problem's spot, m, or None."""
        return next((problem.xy for problem in self.problems if problem.xy is not None), None)


class MeshError(HeatvouchError):
    """A mesh could not be made, or does not agree with the section."""


class StoreError(HeatvouchError):
    """A record could not be written or read."""


class SystemLibraryMissing(HeatvouchError):
    """A library of the operating system, which the mesh maker needs, is not installed.

    Parameters
    ----------
    missing : str
        What the loader said.
    """

    PACKAGES = "libgl1 libglu1-mesa libxrender1 libxcursor1 libxft2 libxinerama1 libgomp1"
    """Debian 12 packages that hold the libraries which gmsh links to."""

    def __init__(self, missing: str) -> None:
        self.missing = missing
        super().__init__(
            f"gmsh cannot start because a system library is missing ({missing}); "
            f"on Debian install: sudo apt-get install {self.PACKAGES}"
        )

    def __reduce__(self) -> tuple[Any, ...]:
        """Let the error cross from a worker process whole."""
        return type(self), (self.missing,)


def refusal(allowed: str, hint: str) -> PydanticCustomError:
    """Return the error that a validator raises; it becomes a `Problem` once the whole docket was read."""
    return PydanticCustomError("refused", "allowed: {allowed}; to mend: {hint}", {"allowed": allowed, "hint": hint})


def _ended(sentence: str) -> str:
    return sentence if sentence.endswith((".", "?", "!")) else f"{sentence}."


class Said(str):
    """Words about a value, which a message repeats as they are instead of quoting them."""

    __slots__ = ()


def shown(value: Any) -> str:
    """Return a refused value as a message repeats it: short, on one line."""
    text = str(value) if isinstance(value, Said) else f'"{value}"' if isinstance(value, str) else repr(value)
    text = " ".join(text.split())
    return text if len(text) <= LONGEST_VALUE else text[: LONGEST_VALUE - 1] + "…"
