"""A scalar of time, place and temperature: the one form in which the solver reads data.

Every schedule, property, film coefficient, source and start is turned into a `Law` before the first equation is assembled.
A law names what it needs, so that the solver can evaluate constants once, schedules once per stage and the rest where it must.
"""

import inspect
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from fem.errors import DocketError

VARIABLES = ("t", "x", "y", "T")


@dataclass(frozen=True, order=True)
class Break:
    """An instant at which a law of time is not smooth.

    Attributes
    ----------
    t : float
        The instant, s.
    jump : bool
        True when the value itself jumps, False when only its slope does.
    """

    t: float
    jump: bool


@dataclass(frozen=True, eq=False)
class Law:
    """A scalar value as a function of any of t [s], x, y [m] and T [K].

    Attributes
    ----------
    evaluate : callable
        Called with exactly the keywords in `needs`; numpy-vectorised.
    needs : frozenset of str
        The variables, a subset of ``{"t", "x", "y", "T"}``.
    breaks : tuple of Break
        Instants at which the value jumps or kinks, increasing.
    name : str
        For messages.
    """

    evaluate: Callable[..., Any]
    needs: frozenset[str] = frozenset()
    breaks: tuple[Break, ...] = field(default=())
    name: str = ""

    def __call__(self, *, t: Any = 0.0, x: Any = 0.0, y: Any = 0.0, T: Any = 0.0) -> Any:
        """Evaluate at the given time [s], place [m] and temperature [K]; arrays broadcast."""
        given = {"t": t, "x": x, "y": y, "T": T}
        return self.evaluate(**{name: given[name] for name in VARIABLES if name in self.needs})

    @property
    def constant(self) -> bool:
        """True when the law depends on nothing."""
        return not self.needs


def constant(value: float) -> Law:
    """Return the law that has one value always and everywhere."""
    number = float(value)
    return Law(lambda: number, name=f"{number:g}")


def as_law(value: Any, *, allowed: Iterable[str] = VARIABLES, breaks: Iterable[Break] = ()) -> Law:
    """Turn a number, a callable or a law into a `Law`.

    Parameters
    ----------
    value : float, callable or Law
        A callable says by the names of its parameters what it needs: any of ``t`` [s], ``x``, ``y`` [m], ``T`` [K].
    allowed : iterable of str
        The variables that make sense in the place where the law is used.
    breaks : iterable of Break
        Instants at which a callable jumps or kinks; it cannot be asked for them.

    Raises
    ------
    DocketError
        If the value is neither, or needs a variable that is not allowed here.

    Examples
    --------
    >>> as_law(3.5)()
    3.5
    >>> sorted(as_law(lambda t, x: t + x).needs)
    ['t', 'x']
    """
    if isinstance(value, Law):
        law = value
    elif callable(value):
        parameters = inspect.signature(value).parameters.values()
        names = frozenset(
            p.name for p in parameters if p.default is inspect.Parameter.empty
        )  # defaults bind values, not variables
        law = Law(value, names, tuple(sorted(breaks)), getattr(value, "__name__", "callable"))
    elif isinstance(value, int | float | np.number):
        law = constant(float(value))
    else:
        raise DocketError.single("a value", repr(value), "a number, a callable or a Law", "pass one of these")
    strangers = law.needs - frozenset(allowed)
    if strangers:
        raise DocketError.single(
            f"law {law.name!r}",
            ", ".join(sorted(strangers)),
            "a callable whose parameters are among " + ", ".join(sorted(allowed)),
            "rename or drop the parameter",
        )
    return law
