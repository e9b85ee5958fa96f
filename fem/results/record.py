"""The record of one run: all that a signature rests on, and enough to draw every result again without solving.

A record holds plain data and arrays only. It is made by `fem.earn.recording`, kept by `fem.results.store`, read by everything else.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.results.figures import Figures
from fem.results.findings import Finding
from fem.results.ledger import Ledger
from fem.results.verdicts import Verdict

Floats = NDArray[np.float64]

FORMAT = 1


@dataclass(frozen=True)
class Reason:
    """Why a standing is open.

    Attributes
    ----------
    text : str
    close : str
        What would close it.
    """

    text: str
    close: str


@dataclass(frozen=True)
class TurnNote:
    """One turn of a vouch, as told to the user.

    Attributes
    ----------
    found, then : str
        What was found, what was done next.
    cells, steps : int
        Of the finest run so far.
    seconds : float
        Since the beginning.
    """

    found: str
    then: str
    cells: int
    steps: int
    seconds: float


@dataclass(frozen=True)
class RecordMesh:
    """The finest mesh.

    Attributes
    ----------
    points : (N, 2) float
        m.
    cells : (M, 3) int
    region : (M,) int
        Index into `region_names`.
    region_names : tuple of str
    facets : (F, 2) int
        Node pairs on the section's curves.
    facet_labels : tuple of str
        For each facet the names of the edges that it lies on, joined by ", ".
    """

    points: Floats
    cells: NDArray[np.intp]
    region: NDArray[np.intp]
    region_names: tuple[str, ...]
    facets: NDArray[np.intp]
    facet_labels: tuple[str, ...]


@dataclass(frozen=True)
class Fields:
    """Fields on the finest mesh.

    Attributes
    ----------
    times : (f,) float
        s.
    T : (f, N) float
        K.
    peak, low : (N,) float
        Highest and lowest temperature of each node at any step, K.
    peak_time : (N,) float
        s.
    doubt : (M,) float
        Doubt of each cell, K; NaN in a quick look, which has none.
    """

    times: Floats
    T: Floats
    peak: Floats
    low: Floats
    peak_time: Floats
    doubt: Floats


@dataclass(frozen=True)
class Record:
    """One run.

    Attributes
    ----------
    kind : str
        "quick look" or "vouch".
    title, content_hash, created : str
        `created` in ISO 8601, UTC.
    shelvable : bool
        False when the docket holds callables, whose content cannot be hashed.
    versions : dict
        Of the program and the libraries that a number rests on.
    docket_text : str
        The docket as a file.
    units : tuple of str
        Length, time and temperature unit in which the docket speaks.
    steady, revolution : bool
    outcome : str
        "finished", or why not, or "interrupted".
    standing : str
        "vouched" or "open".
    reasons : tuple of Reason
        Empty when vouched.
    turns : tuple of TurnNote
    figures : Figures
        All series with bands.
    verdicts : tuple of Verdict
    findings : tuple of Finding
    ledger : Ledger
    mesh : RecordMesh
    fields : Fields
    facts : dict
        Numbers of the work: cells and nodes per level, steps, factorizations, seconds per run.
    seconds : float
        Of the whole work.
    """

    kind: str
    title: str
    content_hash: str
    created: str
    shelvable: bool
    versions: dict[str, str]
    docket_text: str
    units: tuple[str, str, str]
    steady: bool
    revolution: bool
    outcome: str
    standing: str
    reasons: tuple[Reason, ...]
    turns: tuple[TurnNote, ...]
    figures: Figures
    verdicts: tuple[Verdict, ...]
    findings: tuple[Finding, ...]
    ledger: Ledger
    mesh: RecordMesh
    fields: Fields
    facts: dict[str, object]
    seconds: float

    def spot(self, region: str, *, lowest: bool = False) -> tuple[float, float]:
        """Return where a region (or ``""``, the whole section) gets hottest, or coldest, over the whole run, m."""
        nodes = np.arange(len(self.mesh.points))
        if region:
            nodes = np.unique(self.mesh.cells[self.mesh.region == self.mesh.region_names.index(region)])
        extreme = np.argmin(self.fields.low[nodes]) if lowest else np.argmax(self.fields.peak[nodes])
        x, y = self.mesh.points[nodes[extreme]]
        return float(x), float(y)
