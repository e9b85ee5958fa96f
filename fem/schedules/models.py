"""Schedules: values over time, as a docket states them, and the laws that they become.

Every schedule is a table whose first key names it: `points`, `firing`, `log`, `daily`, `daily_wave`, `fire`, and, for a
film coefficient, `over_temperature`. What it says nothing about, it does not cover: outside its times a schedule is
refused unless it states ``before = "hold"`` or ``after = "hold"``.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal, Self

import numpy as np
from pydantic import Field, model_validator
from pydantic_core import core_schema

from fem.errors import DocketError, refusal
from fem.laws import Law, as_law, constant
from fem.quantities.kinds import KINDS
from fem.quantities.strict import fault, raise_all, unknown_key
from fem.quantities.units import Quantity, Reading, Temperature, Time, reading, said
from fem.schedules.base import Schedule, Value, pasted
from fem.schedules.daily import Daily, DailyWave, Wave
from fem.schedules.fire_curves import COOLEST, Curve, fire_law
from fem.schedules.logged import Log
from fem.schedules.ramps import Firing, FiringPlan, FiringStep, Points

__all__ = [
    "Daily",
    "DailyWave",
    "Fire",
    "Firing",
    "FiringPlan",
    "FiringStep",
    "Log",
    "OverTemperature",
    "Points",
    "Schedule",
    "ScheduleLike",
    "Scheduled",
    "Wave",
    "law_of",
    "span_of",
    "varies",
]


class Fire(Schedule):
    """A nominal fire curve of EN 1991-1-2:2002, 3.2."""

    fire: Curve = Field(description='"standard", "external" or "hydrocarbon".')
    ambient: Temperature = Field(
        COOLEST, description="Before the fire; the standard says 20 degC, another value moves the whole curve."
    )
    starts_at: Time = Field(0.0, description="The clock time at which the fire starts.")

    def law(self, begin: float, end: float) -> Law:  # noqa: ARG002 - one kink, wherever the clock is
        """Return the curve."""
        return fire_law(self.fire, ambient=self.ambient, starts_at=self.starts_at)


class OverTemperature(Schedule):
    """A film coefficient over the temperature of the surface; it does not vary in time of itself."""

    over_temperature: tuple[tuple[Temperature, Value], ...] = Field(
        min_length=2, description="Rows of surface temperature and value, or the same pasted as text; straight between."
    )
    outside: Literal["hold"] = Field(
        description='Must be "hold": the end values stand beyond the table, whatever the surface reaches.'
    )

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read pasted text as rows."""
        key = "over_temperature"
        return {**data, key: pasted(data[key])} if isinstance(data, dict) and key in data else data

    @model_validator(mode="after")
    def _increasing(self, info: core_schema.ValidationInfo) -> Self:
        units = reading(info.context).units
        T = [row[0] for row in self.over_temperature]
        back = [i for i in range(1, len(T)) if T[i] <= T[i - 1]]
        lines = []
        for i in back:
            value = said(T[i], "temperature", units)
            lines.append(
                fault(("over_temperature", i, 0), value, "a temperature above the one before", "sort the rows")
            )
        raise_all("over_temperature", lines)
        return self

    def law(self, begin: float, end: float) -> Law:  # noqa: ARG002 - no time in it
        """Return the table as a law of T [K]."""
        T, v = np.array(self.over_temperature, dtype=np.float64).T
        return Law(lambda T, rows=T, values=v: np.interp(T, rows, values), frozenset({"T"}), name="over temperature")

    @property
    def varies(self) -> bool:
        """False: it depends on the surface, not on time."""
        return False


ScheduleLike = float | Schedule | Law | Callable[..., Any]
"""What a field that varies in time holds: a number in SI, a schedule, or from Python a law or callable."""

SCHEDULES: dict[str, type[Schedule]] = {
    "points": Points,
    "firing": Firing,
    "log": Log,
    "daily": Daily,
    "daily_wave": DailyWave,
    "fire": Fire,
    "over_temperature": OverTemperature,
}
"""The key that names a schedule, and its model."""


@dataclass(frozen=True)
class Scheduled:
    """Marks a pydantic field that varies in time.

    Attributes
    ----------
    kind : str
        What its values are, a key of `fem.quantities.kinds.KINDS`.
    variables : tuple of str
        What a law or callable may depend on.
    """

    kind: str
    variables: tuple[str, ...] = ("t", "x", "y")

    def models(self) -> dict[str, type[Schedule]]:
        """Return the schedules that make sense here, by key."""
        if "t" not in self.variables:
            return {}
        unfit = {"fire"} if self.kind != "temperature" else set()
        unfit |= {"over_temperature"} if "T" not in self.variables else set()
        return {key: model for key, model in SCHEDULES.items() if key not in unfit}

    def read(self, value: Any, context: Reading) -> ScheduleLike:
        """Return the value with all its numbers in SI.

        Raises
        ------
        PydanticCustomError, ValidationError
            If it is not a schedule of this kind.
        """
        if callable(value):
            return self._callable(value)
        if isinstance(value, dict):
            return self._model(value).model_validate(value, context=context.of_kind(self.kind))
        if isinstance(value, Schedule):
            if type(value) not in self.models().values():
                raise refusal(f"the schedules {', '.join(self.models())}", "use one of these")
            model: type[Schedule] = type(value)
            return model.model_validate(dict(value), context=Reading(kind=self.kind, logs=context.logs))
        if isinstance(value, list | tuple):
            hint = "write rows of time and value as { points = [[t, v], ...] }" if self.models() else "write one number"
            raise refusal(self.allowed(), hint)
        return Quantity(self.kind).read(value, context.units)

    def allowed(self) -> str:
        """Return what may stand here."""
        what = KINDS[self.kind]
        table = f", or a table with one of the keys {', '.join(self.models())}" if self.models() else ""
        return f"a {what.name} as a number, or as text such as {what.examples}{table}"

    def _model(self, value: dict[str, Any]) -> type[Schedule]:
        models = self.models()
        named = [key for key in value if key in models]
        if len(named) == 1:
            return models[named[0]]
        if named:
            raise refusal(self.allowed(), f"{' and '.join(named)} are two schedules: keep one")
        word = next(iter(value), "")
        raise refusal(self.allowed(), unknown_key(word, models)[1])

    def _callable(self, value: Law | Callable[..., Any]) -> ScheduleLike:
        try:
            as_law(value, allowed=self.variables)
        except DocketError as error:
            problem = error.problems[0]
            raise refusal(problem.allowed, problem.hint) from error
        return value

    def _validate(self, value: Any, info: core_schema.ValidationInfo) -> ScheduleLike:
        return self.read(value, reading(info.context))

    def __get_pydantic_core_schema__(self, _source: Any, _handler: Any) -> core_schema.CoreSchema:
        """Tell pydantic to read the field through this mark."""
        return core_schema.with_info_plain_validator_function(self._validate)


def law_of(value: ScheduleLike, begin: float = 0.0, end: float = 0.0) -> Law:
    """Return any value of a scheduled field as a law.

    Parameters
    ----------
    value : number, Schedule, Law or callable
        SI.
    begin, end : float
        The clock, s: the law's breaks are complete between them.
    """
    if isinstance(value, Schedule):
        return value.law(begin, end)
    if isinstance(value, int | float):
        return constant(float(value))
    return as_law(value)


def span_of(value: ScheduleLike) -> tuple[float, float]:
    """Return the times, s, between which a value of a scheduled field says something."""
    return value.span() if isinstance(value, Schedule) else (-math.inf, math.inf)


def varies(value: ScheduleLike) -> bool:
    """Return whether a value of a scheduled field depends on time."""
    if isinstance(value, Schedule):
        return value.varies
    return not isinstance(value, int | float) and "t" in as_law(value).needs
