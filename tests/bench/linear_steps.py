"""Steps of a linear march against the least they can cost: one factorization and one back-substitution per stage."""

import time

import numpy as np

from fem.solve.conduction import Conduction
from fem.solve.march import March, StageSolver
from tests.bench.quench import END, equal_steps, mesh_near, posed
from tests.bench.rows import Row, cpu, ratio

SIZES = (5_000, 20_000, 50_000)
STEPS = 40
ROUNDS = 9


def _least(solver: StageSolver, conduction: Conduction, sizes: list[float], count: int) -> float:
    """Return the CPU seconds of factorizing the step matrix for each gamma dt [s], and of `count` back-substitutions."""
    heat, start = np.random.default_rng(1).random(len(conduction.free)), conduction.start()
    solver.factorizer.forget()

    def work() -> None:
        for size in sizes:
            solver.prepare(0.0, start, size, fresh=True)
        for _ in range(count):
            solver.filter(heat)

    return cpu(work)


def _replayed(conduction: Conduction) -> float:
    march = March(conduction, tolerance=0.1, steps=equal_steps(STEPS))
    return cpu(lambda: [None for _ in march])


def _chosen(conduction: Conduction) -> tuple[float, March, list[float]]:
    """Return the CPU seconds of a march that chooses its steps, the march, and the sizes it took."""
    march = March(conduction, tolerance=0.1, first=1.0)
    sizes: list[float] = []
    began = time.process_time()
    for step in march:
        sizes.append(step.t1 - step.t0)
    return time.process_time() - began, march, sizes


def rows() -> list[Row]:
    found = []
    for size in SIZES:
        job = posed()
        conduction = Conduction(mesh_near(job, size), job.problem)
        solver = StageSolver(conduction, 1e-6)
        dt = END / STEPS / 4.0
        value, ours, least = ratio(
            lambda c=conduction: _replayed(c),
            lambda c=conduction, s=solver, d=dt: _least(s, c, [d], 5 * STEPS),
            ROUNDS,
        )
        note = (
            f"{1e3 * ours / STEPS:.2f} ms a step; 1 factorization + {5 * STEPS} substitutions {1e3 * least / STEPS:.2f}"
        )
        found.append(Row("linear step / least", f"{conduction.n} unknowns, replayed", value, 1.5, note))
        found.append(_chosen_row(conduction, solver))
    return found


def _chosen_row(conduction: Conduction, solver: StageSolver) -> Row:
    """Return the row of a march that chooses its steps: as many factorizations as it did, and 6 substitutions a step."""
    _, march, sizes = _chosen(conduction)
    taken, changes = len(sizes) + march.rejected, sorted({round(size, 9) for size in sizes})
    factors = [changes[i % len(changes)] / 4.0 for i in range(march.factorizations)]
    value, ours, theirs = ratio(
        lambda: _chosen(conduction)[0],
        lambda: _least(solver, conduction, factors, 6 * taken),
        ROUNDS,
    )
    note = (
        f"{taken} steps ({march.rejected} rejected), {march.factorizations} factorizations, {6 * taken} substitutions; "
        f"{ours:.3f} against {theirs:.3f} s"
    )
    return Row("linear step / least", f"{conduction.n} unknowns, chosen", value, 1.5, note)
