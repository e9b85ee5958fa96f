"""A docket file read without our reader: plain TOML and CSV, degC and seconds. Only the terms that the tested scenarios use."""

import csv
import tomllib
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

SECONDS = {"s": 1.0, "min": 60.0, "h": 3600.0}
METRES = {"mm": 1e-3, "cm": 1e-2, "m": 1.0}
STOCKS = Path(__file__).parents[2] / "fem" / "stock" / "data"
Value = Callable[[float], float]
Rows = list[tuple[float, float]]


@dataclass(frozen=True)
class Exposure:
    """What some edges face: values over time [s], in degC, W/(m2 K) and W/m2."""

    name: str
    on: tuple[str, ...]
    held: Value | None
    coefficient: float
    ambient: Value | None
    emissivity: float
    surroundings: Value | None
    flux: Value | None


@dataclass(frozen=True)
class Job:
    regions: list[dict[str, Any]]
    exposures: list[Exposure]
    starts: list[float]
    stocks: list[dict[str, Rows]]
    gauges: dict[str, tuple[float, float]]
    begin: float
    end: float
    every: float


def read(path: Path) -> Job:
    """Return the job of a docket file."""
    data = tomllib.loads(path.read_text(encoding="utf-8"))
    head, clock = data["docket"], data["clock"]
    assert head["temperature"] == "degC"
    metre, second = METRES[head["length"]], SECONDS[head["time"]]
    regions = data["region"]
    for region in regions:
        region["points"] = [(row[0] * metre, row[1] * metre) for row in region["outline"]]
        region["edges"] = [row[2] if len(row) > 2 else "" for row in region["outline"]]
    library: dict[str, Any] = {}
    for file in STOCKS.glob("*.toml"):
        library |= tomllib.loads(file.read_text(encoding="utf-8"))["stock"]
    return Job(
        regions,
        [_exposure(e, path.parent, second) for e in data["exposure"]],
        [r.get("start", data["start"].get("everywhere")) for r in regions],
        [_stock(library[r["stock"]]) for r in regions],
        {g["name"]: (g["at"][0] * metre, g["at"][1] * metre) for g in data["gauge"]},
        clock.get("begin", 0) * second,
        clock["end"] * second,
        clock["report_every"] * second,
    )


def _stock(stock: dict[str, Any]) -> dict[str, Rows]:
    found = {}
    for name in ("conductivity", "density", "specific_heat"):
        value = stock[name]
        if isinstance(value, dict):
            value = value.get("table", value.get("value"))
        found[name] = [(0.0, float(value))] if not isinstance(value, list) else [(a, b) for a, b in value]
    return found


def _exposure(data: dict[str, Any], folder: Path, second: float) -> Exposure:
    film, radiant = data.get("film", {}), data.get("radiant", {})
    assert not set(data) - {"name", "on", "film", "radiant", "flux", "held"}
    on = [data["on"]] if isinstance(data["on"], str) else data["on"]
    value = {
        name: _schedule(given, folder, second)
        for name, given in (
            ("held", data.get("held")),
            ("ambient", film.get("ambient")),
            ("surroundings", radiant.get("surroundings")),
            ("flux", data.get("flux")),
        )
    }
    return Exposure(
        name=data["name"],
        on=tuple(on),
        coefficient=float(film.get("coefficient", 0.0)),
        emissivity=float(radiant.get("emissivity", 0.0)),
        **value,
    )


def _schedule(given: Any, folder: Path, second: float) -> Value | None:
    if given is None:
        return None
    if isinstance(given, int | float):
        return lambda t, c=float(given): c
    if "daily" in given:
        rows = [*given["daily"], [given["daily"][0][0] + 86400 / second, given["daily"][0][1]]]
        at, value = np.array(rows, dtype=float).T
        return lambda t: float(np.interp((t / second - at[0]) % (86400 / second) + at[0], at, value))
    assert not set(given) - {"log", "time", "column", "scale"}, given
    with (folder / given["log"]).open(encoding="utf-8") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    at = np.array([float(row[given["time"]]) for row in rows]) * second
    value = np.array([float(row[given["column"]]) for row in rows]) * given.get("scale", 1.0)
    return lambda t: float(np.interp(t, at, value))
