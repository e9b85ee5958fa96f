"""What the edges of a section face: held, flux, film, radiant surroundings. An edge that faces nothing is insulated."""

from typing import Annotated, Any, Self

from pydantic import Field, model_validator
from pydantic_core import core_schema

from fem.docket.regions import DotlessName, Name, Point
from fem.errors import Said, refusal
from fem.quantities.strict import Strict, fault, raise_all
from fem.quantities.units import Heat
from fem.schedules.models import Scheduled

Held = Annotated[Any, Scheduled("temperature")]
Ambient = Annotated[Any, Scheduled("temperature")]
FluxIn = Annotated[Any, Scheduled("heat flux", ("t", "x", "y", "T"))]
Coefficient = Annotated[Any, Scheduled("film coefficient", ("t", "x", "y", "T"))]
Emissivity = Annotated[Any, Scheduled("fraction", ("t", "x", "y", "T"))]


class Stretch(Strict):
    """Part of a region's outline: from one point to another, counter-clockwise; both are projected on the outline.

    It stays where it is when a vertex is moved along the edge or inserted.
    """

    region: DotlessName = Field(description="The region on whose outline it lies.")
    start: Point = Field(description="Where it begins, counter-clockwise.")
    end: Point = Field(description="Where it ends.")

    @model_validator(mode="after")
    def _not_empty(self) -> Self:
        if self.start == self.end:
            lines = [
                fault(
                    ("end",), list(self.end), "a point other than the start", 'write "region.*" for the whole outline'
                )
            ]
            raise_all("stretch", lines)
        return self


class _OnEdge:
    """Reads a reference to an edge: ``region.edge``, ``region.*`` or a stretch."""

    @staticmethod
    def _validate(value: Any, info: core_schema.ValidationInfo) -> str | Stretch:
        if isinstance(value, dict | Stretch):
            return Stretch.model_validate(value, context=info.context)
        if not isinstance(value, str) or value.count(".") != 1 or not all(part.strip() for part in value.split(".")):
            allowed = '"region.edge", "region.*" for the whole outline, or { region, start = [x, y], end = [x, y] }'
            raise refusal(allowed, "write one of these")
        return value

    def __get_pydantic_core_schema__(self, _source: Any, _handler: Any) -> core_schema.CoreSchema:
        """Tell pydantic to read the field through this mark."""
        return core_schema.with_info_plain_validator_function(self._validate)


EdgeRef = Annotated[str | Stretch, _OnEdge()]


class Film(Strict):
    """Heat from a fluid: coefficient times (ambient minus surface temperature)."""

    coefficient: Coefficient = Field(description="Film coefficient, over time or over the surface's temperature.")
    ambient: Ambient = Field(description="Temperature of the fluid.")


class Radiant(Strict):
    """Heat from wide surroundings, seen with view factor 1."""

    emissivity: Emissivity = Field(description="Emissivity of the exchange, from 0 to 1.")
    surroundings: Ambient = Field(description="Temperature of the surroundings.")


class Exposure(Strict):
    """What a stretch of edge faces. Flux, film and radiant add up; a held temperature stands alone."""

    name: Name = Field(description="The exposure's name; heat is totalled under it.")
    on: tuple[EdgeRef, ...] = Field(
        min_length=1, max_length=1000, description='Edges: "region.edge", "region.*" or a stretch.'
    )
    held: Held | None = Field(None, description="Temperature that the surface is held at.")
    flux: FluxIn | None = Field(None, description="Heat flux into the section.")
    film: Film | None = Field(None, description="Coefficient and ambient of a fluid.")
    radiant: Radiant | None = Field(None, description="Emissivity, and temperature of the surroundings.")
    band: Heat | None = Field(
        None, description="Band wanted on the heat flow through it, where it differs from that of all exposures."
    )

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read one edge as a list of one."""
        if isinstance(data, dict) and isinstance(data.get("on"), str | dict | Stretch):
            return {**data, "on": (data["on"],)}
        return data

    @model_validator(mode="after")
    def _something(self) -> Self:
        given = [key for key in ("held", "flux", "film", "radiant") if getattr(self, key) is not None]
        faults = []
        if not given:
            faults.append(
                fault(
                    ("on",),
                    Said("nothing"),
                    "held, flux, film or radiant",
                    "add one; an insulated edge needs no exposure",
                )
            )
        if "held" in given and len(given) > 1:
            faults.append(
                fault(("held",), Said(f"held with {', '.join(given[1:])}"), "held alone", "drop held or the rest")
            )
        raise_all("exposure", faults)
        return self
