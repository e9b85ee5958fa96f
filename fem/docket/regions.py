"""The section of a docket: regions, drawn by their outlines."""

from typing import Annotated, Any, ClassVar, Literal, Self

from pydantic import AfterValidator, Field, model_validator
from pydantic_core import core_schema

from fem.errors import Said, refusal
from fem.quantities.strict import Strict, fault, raise_all, raise_one
from fem.quantities.units import Length, PositiveLength, reading, said
from fem.schedules.models import Scheduled

LONGEST_NAME = 80
RESERVED = ("anywhere",)


def name(text: str) -> str:
    """Return a name if it can be told apart in a message, a table and a path.

    Raises
    ------
    PydanticCustomError
        Otherwise.
    """
    allowed = f'a name of 1 to {LONGEST_NAME} characters without quotes or line breaks; "anywhere" is taken'
    printable = text.isprintable() and not set(text) & set("\"'")
    if not 0 < len(text) <= LONGEST_NAME or not printable or text != text.strip() or text in RESERVED:
        raise refusal(allowed, "choose another name")
    return text


def dotless(text: str) -> str:
    """Return a name that can stand before or after the dot of ``region.edge``.

    Raises
    ------
    PydanticCustomError
        If it holds a dot or a star.
    """
    if set(text) & set(".*"):
        raise refusal("a name without . and *, because edges are called region.edge", "choose another name")
    return name(text)


Name = Annotated[str, AfterValidator(name)]
DotlessName = Annotated[str, AfterValidator(dotless)]
Point = tuple[Length, Length]
StartLike = Annotated[Any, Scheduled("temperature", ("x", "y"))]
Source = Annotated[Any, Scheduled("heat source", ("t", "x", "y", "T"))]


class Vertex(Strict):
    """A corner of an outline and the edge that leaves it.

    In a file: ``[x, y]``, ``[x, y, "name"]``, ``[x, y, "name", { via = [x, y] }]`` or ``[x, y, { via = [x, y] }]``.
    """

    x: Length = Field(description="Across the section; the radius in a body of revolution.")
    y: Length = Field(description="Up the section; along the axis in a body of revolution.")
    edge: DotlessName | None = Field(None, description="Name of the edge that leaves here; several may share one.")
    via: Point | None = Field(None, description="A point through which that edge passes as an arc of a circle.")

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read a row as a table."""
        if not isinstance(data, list | tuple):
            return data
        plain = list(data)
        table = dict(plain.pop()) if len(plain) > 2 and isinstance(plain[-1], dict) else {}
        if not 2 <= len(plain) <= 3:
            allowed = '[x, y], [x, y, "edge"] or [x, y, "edge", { via = [x, y] }]'
            raise_one((), data, allowed, "write the corner as one of these")
        return {**table, **dict(zip(("x", "y", "edge"), plain, strict=False))}

    @classmethod
    def to_short(cls, table: dict[str, Any]) -> Any:
        """Return the table as a row."""
        row = [table["x"], table["y"]] + ([table["edge"]] if "edge" in table else [])
        return [*row, {"via": table["via"]}] if "via" in table else row


class Region(Strict):
    """One closed outline of one stock, or of nothing: a void.

    Regions are drawn in order: a later one cuts earlier ones where they overlap.
    """

    HINTS: ClassVar[dict[str, str]] = {"stock": "add stock, or void = true for a hole"}

    name: DotlessName = Field(description="The region's name.")
    stock: Name | None = Field(
        description="Name of its stock, the docket's own or the library's; in a file void = true for a hole."
    )
    outline: tuple[Vertex, ...] = Field(
        min_length=2, max_length=5000, description="Its corners, in order, either way round."
    )
    source: Source | None = Field(None, description="Heat made in it.")
    start: StartLike | None = Field(
        None, description="Its temperature at the start, where it differs from that everywhere."
    )

    @classmethod
    def file_keys(cls) -> tuple[str, ...]:
        """Return the keys that a file may use."""
        return (*super().file_keys(), "void")

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read void = true as a region of no stock."""
        if not isinstance(data, dict) or "void" not in data:
            return data
        rest = {key: value for key, value in data.items() if key != "void"}
        if data["void"] is not True:
            raise_one(("void",), data["void"], "true", "drop the key where the region is not a void")
        if "stock" in rest:
            raise_one(("void",), data["void"], "a stock or void = true, not both", "drop one of the two")
        return {**rest, "stock": None}

    @classmethod
    def to_short(cls, table: dict[str, Any]) -> Any:
        """Write a region of no stock as void = true."""
        if "stock" in table:
            return table
        return {"name": table["name"], "void": True, **table}

    @model_validator(mode="after")
    def _closed(self, info: core_schema.ValidationInfo) -> Self:
        units, faults = reading(info.context).units, []
        if len(self.outline) == 2 and all(vertex.via is None for vertex in self.outline):
            faults.append(fault(("outline",), Said("two corners"), "three corners, or two and an arc", "add a corner"))
        after = (*self.outline[1:], self.outline[0])
        for i, (here, there) in enumerate(zip(self.outline, after, strict=True)):
            if (here.x, here.y) == (there.x, there.y):
                hint = "drop the corner that is given twice (the outline closes by itself)"
                spot = Said(f"({said(here.x, 'length', units)}, {said(here.y, 'length', units)})")
                faults.append(fault(("outline", i), spot, "corners that differ from the next", hint))
        if self.stock is None and self.source is not None:
            faults.append(fault(("source",), None, "no source in a void", "give the region a stock"))
        if self.stock is None and self.start is not None:
            faults.append(fault(("start",), None, "no start in a void", "give the region a stock"))
        raise_all("region", faults)
        return self

    def edges(self) -> tuple[str, ...]:
        """Return the names of its edges, once each, in order."""
        return tuple(
            dict.fromkeys(corner.edge for corner in self.outline if corner is not None and corner.edge is not None)
        )


class Section(Strict):
    """The 2D cross-section."""

    kind: Literal["planar", "revolution"] = Field(
        description='"planar" (everything per metre of depth) or "revolution" (x is the radius; whole turn).'
    )
    regions: tuple[Region, ...] = Field(
        alias="region", min_length=1, max_length=1000, description="Later ones cut earlier ones."
    )
    gap_tolerance: PositiveLength = Field(
        1e-5, description="Regions that are nearer than this, but apart, are refused or closed."
    )
    close_gaps: bool = Field(default=False, description="Whether such gaps are closed (and noted) rather than refused.")

    @model_validator(mode="after")
    def _right_of_the_axis(self, info: core_schema.ValidationInfo) -> Self:
        units, faults = reading(info.context).units, []
        if self.kind == "revolution":
            for i, region in enumerate(self.regions):
                for j, vertex in enumerate(region.outline):
                    if vertex.x < 0.0:
                        hint = "draw the half of the section on which the radius x is positive"
                        value = said(vertex.x, "length", units)
                        faults.append(fault(("region", i, "outline", j, "x"), value, "a radius >= 0", hint))
        if all(region.stock is None for region in self.regions):
            faults.append(fault(("region",), Said("nothing but voids"), "a region of stock", "give one a stock"))
        raise_all("section", faults)
        return self
