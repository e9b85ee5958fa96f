"""Schedules that repeat every day: points, and a sine."""

import math
from typing import Any, Self

import numpy as np
from pydantic import Field, model_validator
from pydantic_core import core_schema

from fem.errors import DocketError
from fem.laws import Law
from fem.quantities.strict import Strict, fault, raise_all, raise_one
from fem.quantities.units import Duration, Time, reading, said
from fem.schedules.base import Difference, Row, Schedule, Value, order_faults, pasted
from fem.schedules.polyline import polyline

DAY = 86400.0
"""s."""

MOST_KNOTS = 1_000_000
"""Knots of one schedule within one clock; more is a slip in the clock."""


class Daily(Schedule):
    """One day's points, repeated; straight across midnight from the last to the first."""

    daily: tuple[Row, ...] = Field(
        min_length=2,
        description="Rows of time of day and value, or the same pasted as text: from 0 h to 24 h, twice = a jump.",
    )
    midnight: Time = Field(0.0, description="A clock time at which it is midnight.")

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read pasted text as rows."""
        return {**data, "daily": pasted(data["daily"])} if isinstance(data, dict) and "daily" in data else data

    @model_validator(mode="after")
    def _within_a_day(self, info: core_schema.ValidationInfo) -> Self:
        units = reading(info.context).units
        faults = order_faults("daily", self.daily, units)
        for i, (t, _) in enumerate(self.daily):
            if not 0.0 <= t <= DAY:
                faults.append(
                    fault(
                        ("daily", i, 0),
                        said(t, "time", units),
                        "a time of day from 0 h to 24 h",
                        "write the times of one day",
                    )
                )
        if sum(t in (0.0, DAY) for t, _ in self.daily) > 2:
            hint = "write the value before midnight at 24 h and the one after it at 0 h"
            faults.append(fault(("daily",), None, "at most two values at midnight", hint))
        raise_all("daily", faults)
        return self

    def law(self, begin: float, end: float) -> Law:
        """Return the polyline of all days that the clock touches, and one on either side."""
        first = math.floor((begin - self.midnight) / DAY) - 1
        days = math.ceil((end - self.midnight) / DAY) + 1 - first
        if days * len(self.daily) > MOST_KNOTS:
            hint = "shorten the clock or give fewer points per day"
            raise DocketError.single("daily", f"{days} days", f"at most {MOST_KNOTS} points in all", hint)
        day = np.array(self.daily, dtype=np.float64)
        t = ((first + np.arange(days))[:, None] * DAY + day[:, 0]).ravel() + self.midnight
        v = np.tile(day[:, 1], days)
        return polyline(t, v, hold_before=False, hold_after=False, name="daily")


class Wave(Strict):
    """A sine over the day."""

    mean: Value = Field(description="The mean.")
    swing: Difference = Field(description="From the mean to the peak, above zero.")
    peak_at: Duration = Field(description="Time of day of the peak, from 0 h to 24 h.")


class DailyWave(Schedule):
    """A sine with a period of a day.

    Examples
    --------
    >>> wave = DailyWave(daily_wave={"mean": 290.0, "swing": 8.0, "peak_at": 54000.0})
    >>> float(wave.law(0, 86400)(t=54000.0))
    298.0
    """

    daily_wave: Wave = Field(description="Mean, swing and time of the peak.")
    midnight: Time = Field(0.0, description="A clock time at which it is midnight.")

    @model_validator(mode="after")
    def _peak_within_a_day(self, info: core_schema.ValidationInfo) -> Self:
        if self.daily_wave.peak_at > DAY:
            value = said(self.daily_wave.peak_at, "time", reading(info.context).units)
            raise_one(("daily_wave", "peak_at"), value, "a time of day from 0 h to 24 h", "write a time of day")
        return self

    def law(self, begin: float, end: float) -> Law:  # noqa: ARG002 - smooth: no breaks
        """Return the sine; it is smooth."""
        mean, swing = float(self.daily_wave.mean), float(self.daily_wave.swing)
        peak = self.midnight + self.daily_wave.peak_at

        def evaluate(t: Any) -> Any:
            return mean + swing * np.cos(2.0 * np.pi * (t - peak) / DAY)

        return Law(evaluate, frozenset({"t"}), name="daily wave")
