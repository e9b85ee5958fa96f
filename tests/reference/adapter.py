"""A reference case -> a docket through the public Python API -> vouched -> one row per expected entry.

Nothing is tuned per case: default settings, and the wanted band set to the entry's tolerance.
"""

import time
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
from matplotlib.tri import LinearTriInterpolator, Triangulation

from fem.docket import Clock, Docket, Exposure, Film, Gauge, Radiant, Region, Section, Start, Vertex, Wanted
from fem.laws import Law
from fem.results.history import Key
from fem.results.record import Record
from fem.solve.problem import STEFAN_BOLTZMANN
from fem.stock import Stock
from fem.vouch import vouch
from tests.reference.geometry import shapes_of
from tests.reference.values import ZERO_C, law_of

LATER = ("latent heat", "contact", "orthotropic", "shrinkage", "recession")
"""Physics that reports "not supported", by name; nothing else may."""


@dataclass(frozen=True)
class Entry:
    """One expected entry beside what came out."""

    quantity: str
    t: float | None
    value: float
    expected: float
    tol: float
    band: float
    within_tol: bool
    in_band: bool


@dataclass(frozen=True)
class Result:
    """One case."""

    id: str
    supported: bool
    reason: str
    seconds: float
    entries: tuple[Entry, ...]
    steady: bool = False
    ledger: float = 0.0
    standing: str = ""

    def as_dict(self) -> dict[str, Any]:
        """Return the case in the form of the output file."""
        return {
            "id": self.id,
            "supported": self.supported,
            "reason": self.reason,
            "seconds": self.seconds,
            "entries": [asdict(entry) for entry in self.entries],
        }


def missing(case: dict[str, Any]) -> tuple[str, ...]:
    """Return which of the later physics a case needs."""
    materials = case["materials"].values()
    conditions = [c["type"] for edge in case["edges"] for c in edge["conditions"]]
    needs = {
        "latent heat": any(m.get("latent") for m in materials),
        "contact": "contact" in conditions,
        "orthotropic": any(isinstance(m["k"], dict) and "xx" in m["k"] for m in materials),
        "shrinkage": bool(case.get("shrinkage")),
        "recession": bool(case.get("recession")),
    }
    return tuple(name for name in LATER if needs[name])


class Case:
    """One case file, read."""

    def __init__(self, case: dict[str, Any]) -> None:
        self.case = case
        self.celsius = case["temperature_unit"] == "degC"
        self.offset = ZERO_C if self.celsius else 0.0
        self.steady = case["analysis"]["type"] == "steady"

    def law(self, value: Any) -> Law:
        """Return a value that is not a temperature."""
        return law_of(value, celsius=self.celsius)

    def temperature(self, value: Any) -> Law:
        """Return a temperature as a law in kelvin."""
        return law_of(value, celsius=self.celsius, offset=self.offset)

    def docket(self) -> Docket:
        """Return the case as a docket."""
        case = self.case
        return Docket(
            title=case["title"],
            section=Section(
                kind="planar" if case["coordinates"] == "planar" else "revolution", regions=tuple(self._regions())
            ),
            stock={name: self._stock(m) for name, m in case["materials"].items()},
            exposures=tuple(self._exposures()),
            clock=None if self.steady else self._clock(),
            start=self._start(),
            gauges=tuple(self._gauges()),
            wanted=self._wanted(),
        )

    def _regions(self) -> list[Region]:
        regions = {region["id"]: region for region in self.case["geometry"]["regions"]}
        by_region = self.case["initial"].get("by_region", {})
        found = []
        for shape in shapes_of(self.case["geometry"]):
            outline = tuple(Vertex(x=p.start[0], y=p.start[1], edge=p.name, via=p.via) for p in shape.pieces)
            if shape.region is None:
                found.append(Region(name=shape.name, stock=None, outline=outline))
                continue
            region = regions[shape.region]
            source = None if region.get("q_gen") is None else self.law(region["q_gen"])
            start = self.temperature(by_region[shape.region]) if shape.region in by_region else None
            found.append(Region(name=shape.name, stock=region["material"], outline=outline, source=source, start=start))
        return found

    def _stock(self, material: dict[str, Any]) -> Stock:
        return Stock(
            conductivity=self.law(material["k"]),
            density=self.law(material["rho"]),
            specific_heat=self.law(material["c"]),
        )

    def _exposures(self) -> list[Exposure]:
        """Return one exposure per condition; conditions of one edge add up, and so does their heat."""
        holders: dict[str, list[str]] = {}
        for region in self.case["geometry"]["regions"]:
            for number, loop in enumerate(region["loops"]):
                outline = region["id"] if number == 0 else f"{region['id']} hole {number}"
                for entry in loop:
                    holders.setdefault(entry.removeprefix("-"), []).append(f"{outline}.{entry.removeprefix('-')}")
        found = []
        for edge in self.case["edges"]:
            on = tuple(name for curve in edge["curves"] for name in holders[curve])
            for i, condition in enumerate(edge["conditions"]):
                if condition["type"] != "adiabatic":
                    name = f"{edge['id']} {i}"
                    found.append(
                        Exposure(name=name, on=on, band=self._flow_band(edge["id"]), **self._condition(condition))
                    )
        return found

    def _flow_band(self, edge: str) -> float | None:
        tols = [float(e["tol"]) for e in self.case["expected"] if e["quantity"] == "heat_flow" and e["edge"] == edge]
        return min(tols, default=None)

    def _condition(self, condition: dict[str, Any]) -> dict[str, Any]:
        match condition["type"]:
            case "temperature":
                return {"held": self.temperature(condition["value"])}
            case "flux":
                return {"flux": self.law(condition["value"])}
            case "convection":
                return {
                    "film": Film(coefficient=self.law(condition["h"]), ambient=self.temperature(condition["T_amb"]))
                }
            case "radiation":
                # Another Stefan-Boltzmann constant than ours is carried by the emissivity.
                ratio = condition.get("sigma", STEFAN_BOLTZMANN) / STEFAN_BOLTZMANN
                law = self.law(condition["emissivity"])
                emissivity = Law(lambda **v: law.evaluate(**v) * ratio, law.needs, law.breaks)
                return {"radiant": Radiant(emissivity=emissivity, surroundings=self.temperature(condition["T_amb"]))}
        raise ValueError(f"unknown condition {condition['type']}")

    def _clock(self) -> Clock:
        analysis = self.case["analysis"]
        times = {e["t"] for e in self.case["expected"] if e["t"] is not None} | set(analysis.get("output_times", []))
        end = float(analysis["t_end"])
        return Clock(begin=0.0, end=end, report_every=end, instants=tuple(sorted(float(t) for t in times)))

    def _start(self) -> Start:
        value = self.case["initial"].get("T")
        return Start(everywhere=None if value is None else self.temperature(value))

    def gauge_name(self, entry: dict[str, Any]) -> str:
        """Return the gauge that reads a temperature entry."""
        x, y = entry["point"]
        return f"{x!r} {y!r}"

    def _gauges(self) -> list[Gauge]:
        bands: dict[str, tuple[float, float, float]] = {}
        for entry in self.case["expected"]:
            if entry["quantity"] == "temperature":
                name = self.gauge_name(entry)
                tol = min(entry["tol"], bands[name][2]) if name in bands else entry["tol"]
                bands[name] = (*map(float, entry["point"]), float(tol))
        return [Gauge(name=name, x=x, y=y, band=tol) for name, (x, y, tol) in bands.items()]

    def _wanted(self) -> Wanted:
        def narrowest(quantity: str) -> float | None:
            return min((float(e["tol"]) for e in self.case["expected"] if e["quantity"] == quantity), default=None)

        gauges = narrowest("temperature")
        means = narrowest("mean_temperature")
        return Wanted(
            gauges=gauges if gauges is not None else means if means is not None else 1.0,
            means=means,
            stored=narrowest("stored_energy_change"),
        )

    # --- what came out ---------------------------------------------------------------------------------------------------------

    def read(self, record: Record, entry: dict[str, Any]) -> tuple[float, float]:
        """Return value (in the case's unit) and band of an expected entry."""
        t = 1.0 if entry["t"] is None else float(entry["t"])
        match entry["quantity"]:
            case "temperature":
                value, band = record.figures.at(Key("gauge", self.gauge_name(entry)), t)
                return value - self.offset, band
            case "mean_temperature":
                name = entry.get("region") or (
                    "" if len(self.case["geometry"]["regions"]) > 1 else record.mesh.region_names[0]
                )
                value, band = record.figures.at(Key("mean", name), t)
                return value - self.offset, band
            case "stored_energy_change":
                return record.figures.at(Key("stored", ""), t)
            case "heat_flow":
                parts = [record.figures.at(key, t) for key in self._flows(record, entry["edge"])]
                return sum(v for v, _ in parts), sum(b for _, b in parts)
            case "isotherm_position":
                return self._isotherm(record, entry)
        raise ValueError(f"unknown quantity {entry['quantity']}")

    def _isotherm(self, record: Record, entry: dict[str, Any]) -> tuple[float, float]:
        """Return where the isotherm crosses a line, and its band: the doubt of the cells along the line over the slope there, m."""
        a, b = (np.array(p, dtype=float) for p in entry["along"])
        frame = 0 if entry["t"] is None else int(np.argmin(np.abs(record.fields.times - entry["t"])))
        s = np.linspace(0.0, 1.0, 4001)
        line = a + s[:, None] * (b - a)
        grid = Triangulation(*record.mesh.points.T, record.mesh.cells)
        T = LinearTriInterpolator(grid, record.fields.T[frame])(*line.T).filled(np.nan) - self.offset
        length = float(np.linalg.norm(b - a))
        side = np.sign(T - float(entry["isotherm"]))
        i = int(np.flatnonzero(side[:-1] * side[1:] <= 0.0)[0])
        slope = (T[i + 1] - T[i]) / (s[i + 1] - s[i]) / length
        at = s[i] * length + (float(entry["isotherm"]) - T[i]) / slope
        doubt = float(record.fields.doubt[grid.get_trifinder()(*line[i])])
        return at, doubt / abs(slope)

    def _flows(self, record: Record, edge: str) -> list[Key]:
        conditions = next(e["conditions"] for e in self.case["edges"] if e["id"] == edge)
        names = [f"{edge} {i}" for i, c in enumerate(conditions) if c["type"] != "adiabatic"]
        return [Key("flow", name) for name in names if Key("flow", name) in record.figures.keys]


def rounding_of(expected: float, scale: float) -> float:
    """Return how far the printed expected value may lie from the true one, plus 1e-9 of the scale."""
    text = repr(expected)
    digits = text.split("e")[0].partition(".")[2]
    exponent = int(text.split("e")[1]) if "e" in text else 0
    # A value printed with few decimals was rounded; one with all its digits was not.
    printed = 0.5 * 10.0 ** (exponent - len(digits)) if len(digits) <= 6 else 0.0
    return printed + 1e-9 * scale


def run_case(case: dict[str, Any]) -> Result:
    """Run one case."""
    lacking = missing(case)
    if lacking:
        return Result(case["id"], False, "not supported: " + ", ".join(lacking), 0.0, ())
    began = time.perf_counter()
    adapter = Case(case)
    record = vouch(adapter.docket())
    entries = []
    scales = {
        q: max(abs(e["value"]) for e in case["expected"] if e["quantity"] == q)
        for q in {e["quantity"] for e in case["expected"]}
    }
    for entry in case["expected"]:
        value, band = adapter.read(record, entry)
        error = abs(value - entry["value"])
        slack = rounding_of(entry["value"], scales[entry["quantity"]])
        entries.append(
            Entry(
                entry["quantity"],
                entry["t"],
                float(value),
                float(entry["value"]),
                float(entry["tol"]),
                float(band),
                bool(error <= entry["tol"]),
                bool(error <= band + slack),
            )
        )
    seconds = time.perf_counter() - began
    return Result(case["id"], True, "", seconds, tuple(entries), adapter.steady, record.ledger.part, record.standing)


def coverage(results: list[Result]) -> tuple[int, int, float]:
    """Return, over all transient entries: how many the band holds, how many there are, and the median band over the true error."""
    entries = [e for r in results if r.supported and not r.steady for e in r.entries]
    ratios = [e.band / abs(e.value - e.expected) for e in entries if e.value != e.expected]
    return sum(e.in_band for e in entries), len(entries), float(np.median(ratios)) if ratios else 0.0
