"""Each scenario that comes with the program: a quick look and a vouch, in wall seconds."""

from pathlib import Path

from fem.docket.file import read_docket
from fem.results.record import Record
from fem.vouch import look, vouch
from tests.bench.rows import Row

FOLDER = Path(__file__).parents[2] / "scenarios"
LOOK, VOUCH = 3.0, 60.0  # s


def _solving(record: Record) -> float:
    seconds = record.facts["seconds"]
    assert isinstance(seconds, list)
    return float(sum(seconds))


def rows() -> list[Row]:
    found = []
    for path in sorted(FOLDER.glob("*/*.docket.toml")):
        docket, name = read_docket(path), path.parent.name
        quick = look(docket)
        note = f"{quick.seconds:.2f} s with meshing and checks; {quick.facts['nodes']} unknowns, {quick.facts['steps']} steps"
        found.append(Row("quick look, s of solving", name, _solving(quick), LOOK, note))
        whole = vouch(docket)
        note = (
            f"{whole.standing}, {len(whole.turns)} turns; {whole.facts['nodes']} unknowns, {whole.facts['steps']} steps; "
            f"the last study's runs in space {_solving(whole):.2f} s"
        )
        found.append(Row("vouch, s", name, whole.seconds, VOUCH, note))
    return found
