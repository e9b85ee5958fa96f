"""One run on one mesh: march, and note what was asked for along the way."""

import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.mesh.locate import interpolation
from fem.mesh.make import Mesh
from fem.results.history import History, Key
from fem.solve.conduction import Conduction
from fem.solve.march import March, Outcome, Step
from fem.solve.problem import Problem
from fem.solve.stepping import Steps

Floats = NDArray[np.float64]

FRAMES = 120
"""Fields kept per run: enough to draw the run again; between them histories are exact, pictures are not."""

STILL = 1e-6
"""Part of the heat content above 0 K below which nothing is said to move: a ledger that closes to 1e-6 of it closes to 1e-12 of
the content, some thousand times the rounding of a sum."""

Watcher = Callable[[float], bool]
"""Told the simulated time reached, s, after each step; False stops the run."""


@dataclass(frozen=True)
class Gauges:
    """Named points.

    Attributes
    ----------
    names : tuple of str
    points : (n, 2) float
        m.
    """

    names: tuple[str, ...]
    points: Floats


@dataclass
class Run:
    """What one march left.

    Attributes
    ----------
    mesh : Mesh
    outcome : Outcome
    history : History
        Series of every gauge, region, exposure.
    steps : Steps
        Can be replayed.
    frame_times : (f,) float
        s.
    frames : (f, N) float
        Temperatures at the frame times (right before them), K.
    peak, low : (N,) float
        Highest and lowest temperature of each node at any step, K.
    peak_time : (N,) float
        When the highest was reached, s.
    face_heat, made : (n_faces,), (n_regions,) float
        Heat in through each face and made in each region, J.
    stored, exchanged : float
        Heat stored since the start, and the sum of what each node gained or lost, J; `exchanged` is never less than what rounding moves.
    start : (N,) float
        K.
    seconds : float
        Wall time.
    factorizations, solves : int
    """

    mesh: Mesh
    outcome: Outcome
    history: History
    steps: Steps
    frame_times: Floats
    frames: Floats
    peak: Floats
    low: Floats
    peak_time: Floats
    face_heat: Floats
    made: Floats
    stored: float
    exchanged: float
    start: Floats
    seconds: float
    factorizations: int = 0


class Recorder:
    """Turns steps into rows of a history."""

    def __init__(self, conduction: Conduction, gauges: Gauges) -> None:
        self._c = conduction
        self._probe: sp.csr_array = interpolation(conduction.mesh, gauges.points)
        regions = conduction.mesh.plan.region_names
        self._shares = [
            (name, share.nodes, share.size) for name, share in zip(regions, conduction.parts.volumes, strict=True)
        ]
        if len(regions) > 1:
            volume = np.zeros(conduction.n)
            for _, nodes, size in self._shares:
                volume[nodes] += size
            self._shares.append(("", np.arange(conduction.n), volume))
        problem = conduction.problem
        self._totals = problem.totals()
        self._sum = np.array([[float(f.name == name) for f in problem.faces] for name in self._totals]).reshape(
            len(self._totals), len(problem.faces)
        )
        self._faces = [f"{f.name} on {f.edge}" for f in problem.faces]
        if len(self._faces) > len(self._totals):
            self._sum = np.vstack((self._sum, np.eye(len(self._faces))))
        self._sources = [name for name, law in zip(regions, problem.source, strict=True) if law is not None]
        self._makes = np.array([law is not None for law in problem.source])
        self.keys = self._name_rows(gauges.names)
        self.times: list[tuple[float, float]] = []
        self._rows: list[tuple[Floats, Floats, Floats, Floats]] = []
        self.heat = np.zeros(len(problem.faces))
        self.made = np.zeros(len(problem.source))
        self._start_heat = 0.0
        self._last: Step | None = None
        self._end = (np.empty(0), np.empty(0))  # values and rates of the last step's end

    def _name_rows(self, gauges: tuple[str, ...]) -> tuple[Key, ...]:
        keys = [Key("gauge", name) for name in gauges]
        keys += [Key(kind, name) for name, _, _ in self._shares for kind in ("highest", "lowest", "mean")]
        keys.append(Key("stored", ""))
        through = list(self._totals) + [name for name in self._faces if len(self._faces) > len(self._totals)]
        keys += [Key("flow", name) for name in through] + [Key("heat", name) for name in through]
        keys += [Key("made", name) for name in self._sources]
        return tuple(keys)

    def _state(self, T: Floats, d: Floats | None) -> tuple[Floats, Floats]:
        """Return values and rates of all temperature rows and of the stored heat."""
        rate = np.full(self._c.n, np.nan) if d is None else d
        values, rates = [self._probe @ T], [self._probe @ rate]
        for _, mine, size in self._shares:
            Tm, rm = (T, rate) if len(mine) == len(T) else (T[mine], rate[mine])
            high, low, total = np.argmax(Tm), np.argmin(Tm), size.sum()
            values.append(np.array([Tm[high], Tm[low], size @ Tm / total]))
            rates.append(np.array([rm[high], rm[low], size @ rm / total]))
        values.append(np.array([self._c.heat(T).sum() - self._start_heat]))
        rates.append(np.array([self._c.capacity(T) @ rate]))
        return np.concatenate(values), np.concatenate(rates)

    def begin(self, T: Floats) -> None:
        """Note the start, from which stored heat is counted."""
        self._start_heat = float(self._c.heat(T).sum())

    def add(self, step: Step) -> None:
        """Append a step."""
        self.heat = self.heat + step.impulse
        dt = step.t1 - step.t0
        smooth = self._last is not None and step.T0 is self._last.T1 and step.d0 is self._last.d1
        v0, d0 = self._end if smooth else self._state(step.T0, step.d0)
        v1, d1 = self._state(step.T1, step.d1)
        self._last, self._end = step, (v1, d1)
        heat0, heat1 = self._sum @ self.heat, self._sum @ (self.heat + step.heat)
        made0, made1 = self.made, self.made + step.made
        flow0, flow1, mean = self._summed(step.flow0), self._sum @ step.flow, self._sum @ step.heat / dt
        made_rate = (step.made / dt)[self._makes]
        self._rows.append(
            (
                np.concatenate((v0, flow0, heat0, made0[self._makes])),
                np.concatenate((v1, flow1, heat1, made1[self._makes])),
                np.concatenate((d0, mean, flow0, made_rate)),
                np.concatenate((d1, mean, flow1, made_rate)),
            )
        )
        self.times.append((step.t0, step.t1))
        self.heat, self.made = self.heat + step.heat, made1

    def _summed(self, flow: Floats) -> Floats:
        """Return the flow rows right after a jump: unknown only where a face that has no finite flow there takes part."""
        unknown = np.isnan(flow)
        total = self._sum @ np.where(unknown, 0.0, flow)
        return np.where(self._sum @ unknown > 0.0, np.nan, total)

    def history(self) -> History:
        """Return all rows so far."""
        v0, v1, d0, d1 = (np.array([row[i] for row in self._rows]).reshape(-1, len(self.keys)).T for i in range(4))
        t = np.array(self.times).reshape(-1, 2)
        return History(self.keys, t[:, 0].copy(), t[:, 1].copy(), v0, v1, d0, d1)


def run(
    mesh: Mesh,
    problem: Problem,
    gauges: Gauges,
    *,
    tolerance: float,
    first: float = 1.0,
    steps: Steps | None = None,
    frame_times: Floats | None = None,
    watch: Watcher | None = None,
) -> Run:
    """March once and return what was seen; a run that did not finish says so in its outcome.

    Parameters
    ----------
    mesh, problem, gauges
        What to solve and where to look.
    tolerance : float
        Local error per step, K.
    first : float
        First step after each jump, s.
    steps : Steps, optional
        Replay these.
    frame_times : (f,) float, optional
        Step ends at which to keep the field, s; default: all, thinned to `FRAMES`.
    watch : callable, optional
        Progress and cancel.
    """
    began = time.perf_counter()
    conduction = Conduction(mesh, problem)
    march = March(conduction, tolerance=tolerance, steps=steps, first=first)
    recorder = Recorder(conduction, gauges)
    start = march.T.copy()
    recorder.begin(start)
    frames = _Frames(frame_times, problem)
    peak, low, peak_time = start.copy(), start.copy(), np.full(conduction.n, march.begin)
    end = start
    for step in march:
        recorder.add(step)
        for T, t in ((step.T0, step.t0), (step.T1, step.t1)):
            if T is end:
                continue
            end = T
            hotter = peak < T
            peak[hotter], peak_time[hotter] = T[hotter], t
            np.minimum(low, T, out=low)
        frames.offer(step)
        if watch is not None and not watch(step.t1):
            break
    times = [march.begin, *(t1 for _, t1 in recorder.times)]
    breaks = {b.t: b.jump for b in problem.breaks()}
    gained = conduction.heat(march.T) - conduction.heat(start)
    nothing = STILL * float(conduction.capacity(start) @ np.abs(start))
    return Run(
        mesh, march.outcome, recorder.history(), Steps(np.array(times), breaks), frames.times,
        frames.fields(conduction.n), peak, low, peak_time, recorder.heat, recorder.made,
        float(gained.sum()), max(float(np.abs(gained).sum()), nothing), start,
        time.perf_counter() - began, march.factorizations,
    )  # fmt: skip


class _Frames:
    """Keeps fields at wanted times; without them at the begin, the clock's instants and the end, and others thinned to `FRAMES`."""

    def __init__(self, wanted: Floats | None, problem: Problem) -> None:
        self._only = None if wanted is None else {float(t) for t in wanted}
        fixed = problem.instants if len(problem.instants) <= FRAMES else ()
        self._fixed = {*fixed, problem.begin, problem.end}
        self._kept: dict[float, Floats] = {}
        self._every, self._count = 1, 0

    def offer(self, step: Step) -> None:
        if not self._count:
            self._keep(step.t0, step.T0)
        self._count += 1
        if self._count % self._every == 0 or self._only is not None or step.t1 in self._fixed:
            self._keep(step.t1, step.T1)
        loose = [t for t in self._kept if t not in self._fixed]
        if self._only is None and len(loose) > FRAMES:
            self._every *= 2
            for t in loose[::2]:
                del self._kept[t]

    def _keep(self, t: float, T: Floats) -> None:
        if self._only is None or t in self._only:
            self._kept[t] = T

    @property
    def times(self) -> Floats:
        """Return the times, s, (f,)."""
        return np.array(list(self._kept), dtype=np.float64)

    def fields(self, n: int) -> Floats:
        """Return the fields, K, (f, n)."""
        return np.array(list(self._kept.values()), dtype=np.float64).reshape(-1, n)
