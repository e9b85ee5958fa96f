"""The part of a record that is kept as JSON, with its shape stated, so that a damaged file is told from a whole one."""

import math
from typing import Any, Self

from pydantic import BaseModel, ConfigDict, Field, JsonValue, field_serializer, field_validator

from fem.results.figures import Figures
from fem.results.findings import Finding
from fem.results.ledger import Ledger
from fem.results.record import FORMAT, Fields, Reason, Record, RecordMesh, TurnNote
from fem.results.verdicts import Verdict

NOT_FINITE = "not finite"
"""Key of the object that stands for a number without a finite value among the facts, whose types nobody states."""


class Head(BaseModel):
    """Everything of a record but its arrays and its docket's text."""

    model_config = ConfigDict(frozen=True, extra="forbid", ser_json_inf_nan="strings")

    format: int = Field(description="Number of the layout of the folder.")
    kind: str = Field(description='"quick look" or "vouch".')
    title: str = Field(description="The docket's title.")
    content_hash: str = Field(description="Of everything in the docket that can move a number.")
    created: str = Field(description="ISO 8601, UTC.")
    shelvable: bool = Field(description="False when the docket held callables.")
    versions: dict[str, str] = Field(description="Of the program and its libraries.")
    units: tuple[str, str, str] = Field(description="Length, time, temperature of the docket.")
    steady: bool = Field(description="True for a steady state.")
    revolution: bool = Field(description="True for a body of revolution.")
    outcome: str = Field(description='"finished", or why not.')
    standing: str = Field(description='"vouched" or "open".')
    reasons: tuple[Reason, ...] = Field(description="Why it is open, and what would close it.")
    turns: tuple[TurnNote, ...] = Field(description="What each turn found and did.")
    verdicts: tuple[Verdict, ...] = Field(description="On limits; K, K/s, s.")
    findings: tuple[Finding, ...] = Field(description="Of the checks; m.")
    ledger: Ledger = Field(description="J, per metre of depth when planar.")
    facts: dict[str, JsonValue] = Field(description="Numbers of the work.")
    seconds: float = Field(description="Of the whole work.")
    series: tuple[tuple[str, str], ...] = Field(description="Kind and name of each row of figures.npz.")
    region_names: tuple[str, ...] = Field(description="By the index in mesh.npz.")
    facet_labels: tuple[str, ...] = Field(description="By the index in mesh.npz.")

    @field_validator("facts", mode="after")
    @classmethod
    def _open_facts(cls, facts: dict[str, Any]) -> dict[str, Any]:
        return {name: _opened(value) for name, value in facts.items()}

    @field_serializer("facts")
    def _closed_facts(self, facts: dict[str, Any]) -> dict[str, Any]:
        return {name: _closed(value) for name, value in facts.items()}

    def record(self, *, docket_text: str, figures: Figures, mesh: RecordMesh, fields: Fields) -> Record:
        """Return the whole record."""
        mine = {name: getattr(self, name) for name in SHARED}
        return Record(**mine, docket_text=docket_text, figures=figures, mesh=mesh, fields=fields)

    @classmethod
    def of(cls, record: Record, facet_labels: tuple[str, ...]) -> Self:
        """Return the head of a record; `facet_labels` are its facets' names, each once."""
        mine = {name: getattr(record, name) for name in SHARED}
        series = tuple((key.kind, key.name) for key in record.figures.keys)
        return cls(
            **mine, format=FORMAT, series=series, region_names=record.mesh.region_names, facet_labels=facet_labels
        )


SHARED = tuple(name for name in Head.model_fields if name not in ("format", "series", "region_names", "facet_labels"))


def _closed(value: Any) -> Any:
    """Return a fact as JSON can hold it."""
    if isinstance(value, float) and not math.isfinite(value):
        return {NOT_FINITE: str(value)}
    if isinstance(value, list | tuple):
        return [_closed(item) for item in value]
    return {key: _closed(item) for key, item in value.items()} if isinstance(value, dict) else value


def _opened(value: Any) -> Any:
    """Return the fact that `_closed` wrote."""
    if isinstance(value, list):
        return [_opened(item) for item in value]
    if isinstance(value, dict):
        return (
            float(str(value[NOT_FINITE])) if set(value) == {NOT_FINITE} else {k: _opened(v) for k, v in value.items()}
        )
    return value
