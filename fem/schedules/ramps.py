"""Schedules that are typed by hand: points, and the ramps and holds of a firing."""

from typing import Any, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator
from pydantic_core import core_schema

from fem.errors import refusal
from fem.quantities.strict import Strict, fault, raise_all
from fem.quantities.units import Duration, PositiveDuration, Rate, reading
from fem.schedules.base import Knotted, Row, Value, order_faults, pasted

Floats = NDArray[np.float64]


class Points(Knotted):
    """Values at times, straight between them; a time given twice is a jump.

    Examples
    --------
    >>> law = Points(points=[[0, 300], [60, 400]]).law(0, 60)
    >>> law(t=30.0)
    350.0
    """

    points: tuple[Row, ...] = Field(
        min_length=2,
        description="Rows of time and value, or the same pasted as text: straight between, twice = a jump.",
    )

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read pasted text as rows."""
        return {**data, "points": pasted(data["points"])} if isinstance(data, dict) and "points" in data else data

    @model_validator(mode="after")
    def _in_order(self, info: core_schema.ValidationInfo) -> Self:
        raise_all("points", order_faults("points", self.points, reading(info.context).units))
        return self

    def knots(self) -> tuple[Floats, Floats]:
        """Return times, s on the clock, and values, SI."""
        rows = np.array(self.points, dtype=np.float64)
        return rows[:, 0] + self.starts_at, rows[:, 1]


class FiringStep(Strict):
    """One step of a firing: go to a value at a rate or over a time, or hold."""

    to: Value | None = Field(None, description="The value to go to.")
    rate: Rate | None = Field(None, description="How fast to go there; for temperatures.")
    over: Duration | None = Field(None, description="How long to take; nothing at all is a jump.")
    hold: PositiveDuration | None = Field(None, description="How long to stay.")

    @model_validator(mode="after")
    def _one_thing(self) -> Self:
        given = {name for name in ("to", "rate", "over", "hold") if getattr(self, name) is not None}
        if given not in ({"to", "rate"}, {"to", "over"}, {"hold"}):
            allowed = "{ to, rate }, { to, over } or { hold }"
            raise refusal(allowed, f"this step gives {', '.join(sorted(given)) or 'nothing'}")
        return self


class FiringPlan(Strict):
    """Ramps and holds, one after the other."""

    start: Value = Field(description="The value at the begin.")
    steps: tuple[FiringStep, ...] = Field(min_length=1, description="Steps: { to, rate }, { to, over } or { hold }.")

    @model_validator(mode="after")
    def _ramps_go_somewhere(self, info: core_schema.ValidationInfo) -> Self:
        kind, faults, now = reading(info.context).kind, [], self.start
        for i, step in enumerate(self.steps):
            if step.rate is not None and kind not in ("temperature", ""):
                hint = "state how long the ramp takes: over"
                faults.append(fault(("steps", i, "rate"), None, "a rate for temperatures only", hint))
            elif step.rate is not None and step.to == now:
                faults.append(fault(("steps", i, "to"), None, "a value other than the one before", "use { hold }"))
            now = now if step.to is None else step.to
        raise_all("firing", faults)
        return self


class Firing(Knotted):
    """A firing schedule: ramps by rate or by duration, and holds.

    Examples
    --------
    >>> steps = [{"to": 400.0, "rate": 1.0}, {"hold": 50.0}, {"to": 300.0, "over": 200.0}]
    >>> law = Firing(firing={"start": 300.0, "steps": steps}).law(0, 350)
    >>> law(t=120.0), law(t=250.0), [b.t for b in law.breaks]
    (400.0, 350.0, [0.0, 100.0, 150.0, 350.0])
    """

    firing: FiringPlan = Field(description="Start value and steps.")

    def knots(self) -> tuple[Floats, Floats]:
        """Return times, s on the clock, and values, SI."""
        t, v = [self.starts_at], [float(self.firing.start)]
        for step in self.firing.steps:
            to = v[-1] if step.to is None else float(step.to)
            takes = step.hold if step.to is None else step.over
            if step.rate is not None:
                takes = abs(to - v[-1]) / step.rate
            t.append(t[-1] + float(takes or 0.0))
            v.append(to)
        return np.array(t), np.array(v)
