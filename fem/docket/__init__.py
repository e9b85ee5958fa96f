"""The docket: all that a job is, as frozen models, and its file form."""

from fem.docket.models import (
    Allowance,
    Clock,
    Docket,
    EdgeRef,
    Exposure,
    Film,
    Gauge,
    Limit,
    Radiant,
    Region,
    Section,
    Start,
    Stretch,
    Variant,
    Vertex,
    Wanted,
)

__all__ = [
    "Allowance",
    "Clock",
    "Docket",
    "EdgeRef",
    "Exposure",
    "Film",
    "Gauge",
    "Limit",
    "Radiant",
    "Region",
    "Section",
    "Start",
    "Stretch",
    "Variant",
    "Vertex",
    "Wanted",
]
