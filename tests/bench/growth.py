"""How time and memory grow with the mesh: each size in a process of its own. `python -m tests.bench.growth NODES` is one such."""

import json
import os
import subprocess
import sys
from pathlib import Path

import numpy as np

from fem.solve.conduction import Conduction
from fem.solve.run import run
from tests.bench.quench import equal_steps, mesh_near, posed
from tests.bench.rows import Row, cpu

SIZES = (5_000, 10_000, 20_000, 50_000, 100_000, 200_000)
STEPS = 20
ROUNDS = 3
KIB_PER_GB = 1e9 / 1024.0


def measure(nodes: int) -> dict[str, float]:
    """Return unknowns, CPU seconds of the run with its set-up, and the peak of this process's resident memory, GB."""
    job = posed()
    mesh = mesh_near(job, nodes)
    best = min(
        cpu(lambda: run(mesh, job.problem, job.gauges, tolerance=0.1, steps=equal_steps(STEPS))) for _ in range(ROUNDS)
    )
    return {"unknowns": len(Conduction(mesh, job.problem).free), "seconds": best, "peak": peak()}


def peak() -> float:
    """Return the peak of this program's resident memory, GB.

    Not from getrusage: what that tells on Linux begins with the memory of the parent.
    """
    status = Path("/proc/self/status").read_text(encoding="ascii")
    return float(status.partition("VmHWM:")[2].split()[0]) / KIB_PER_GB


def _apart(nodes: int) -> dict[str, float]:
    one = {**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    command = [sys.executable, "-m", "tests.bench.growth", str(nodes)]
    done = subprocess.run(command, env=one, capture_output=True, text=True, check=True)
    return json.loads(done.stdout)


def rows() -> list[Row]:
    found = [_apart(nodes) for nodes in SIZES]
    n, t = (np.array([one[key] for one in found]) for key in ("unknowns", "seconds"))
    exponent = float(np.polyfit(np.log(n), np.log(t), 1)[0])
    steepest = float(np.max(np.diff(np.log(t)) / np.diff(np.log(n))))
    most = max(one["peak"] for one in found)
    times = ", ".join(f"{one['unknowns']:.0f}: {one['seconds']:.2f} s, {one['peak']:.2f} GB" for one in found)
    case = f"{n[0]:.0f} to {n[-1]:.0f} unknowns"
    return [
        Row("exponent of time", f"{case}, {STEPS} steps", exponent, 1.25, f"steepest between two sizes {steepest:.2f}"),
        Row("peak memory, GB", case, most, 4.0, times),
    ]


if __name__ == "__main__":
    print(json.dumps(measure(int(sys.argv[1]))))
