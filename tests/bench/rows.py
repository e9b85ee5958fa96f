"""One measured row with its bound, and how to measure: interleaved, in CPU seconds, by the median."""

import time
from collections.abc import Callable
from dataclasses import asdict, dataclass
from statistics import median
from typing import Any


@dataclass(frozen=True)
class Row:
    """One measured number; `bound` None means that it is told, not judged."""

    what: str
    case: str
    value: float
    bound: float | None
    note: str = ""

    @property
    def holds(self) -> bool:
        return self.bound is None or self.value <= self.bound

    def as_dict(self) -> dict[str, Any]:
        return {**asdict(self), "holds": self.holds}


def markdown(rows: list[Row]) -> str:
    lines = ["| what | case | measured | bound | holds | note |", "|---|---|---|---|---|---|"]
    for row in rows:
        bound, holds = ("", "") if row.bound is None else (f"≤ {row.bound:g}", "yes" if row.holds else "**NO**")
        lines.append(f"| {row.what} | {row.case} | {row.value:.3g} | {bound} | {holds} | {row.note} |")
    return "\n".join(lines)


def cpu(work: Callable[[], Any]) -> float:
    """Return the CPU seconds of one call: other programs on the machine do not count, a second thread would."""
    began = time.process_time()
    work()
    return time.process_time() - began


def ratio(ours: Callable[[], float], theirs: Callable[[], float], rounds: int) -> tuple[float, float, float]:
    """Measure both in turns; return the median of the rounds' ratios, and the median seconds of each."""
    pairs = [(ours(), theirs()) for _ in range(rounds)]
    return median(a / b for a, b in pairs), median(a for a, _ in pairs), median(b for _, b in pairs)
