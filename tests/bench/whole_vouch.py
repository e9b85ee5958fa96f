"""A whole vouch against the single finest run in it: what the bands cost."""

import time
from statistics import median

from fem.mesh.make import make_mesh
from fem.vouch import vouch
from tests.bench.quench import docket, posed
from tests.bench.rows import Row

BAND = 0.02  # K; needs more than 20 000 unknowns on the finest mesh
LEAST_NODES = 20_000
ROUNDS = 3


def rows() -> list[Row]:
    job = docket(BAND)
    start = posed()
    pairs, meshing, note = [], [], ""
    for _ in range(ROUNDS):
        began = time.perf_counter()
        make_mesh(start.plan, gauges=start.gauges.points)
        meshing.append(time.perf_counter() - began)
        record = vouch(job)
        nodes, seconds = record.facts["nodes"], record.facts["seconds"]
        assert isinstance(nodes, list)
        assert isinstance(seconds, list)
        if nodes[-1] < LEAST_NODES:
            raise RuntimeError(f"the finest mesh has {nodes[-1]} unknowns only: narrow the band of this job")
        pairs.append((record.seconds, seconds[-1]))
        steps = record.facts["steps"]
        note = f"{nodes} unknowns, {steps} steps, {len(record.turns)} turns, {record.standing}"
    mesh = median(meshing)
    whole, finest = median(a for a, _ in pairs), median(b for _, b in pairs)
    value = median((a - m) / b for (a, b), m in zip(pairs, meshing, strict=True))
    return [
        Row("whole vouch / its finest run", "without meshing", value, 1.6, note),
        Row(
            "whole vouch / its finest run", "with meshing", whole / finest, None, f"{whole:.2f} against {finest:.2f} s"
        ),
        Row("meshing of the first mesh, s", "the same", mesh, None),
    ]
