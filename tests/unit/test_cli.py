"""The commands: what they print, how they end, what they refuse."""

import io
import json
import math
import os
import re
import signal
import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace

import pytest
from rich.console import Console
from typer.testing import CliRunner

from fem.cli import app as cli
from fem.cli import run as cli_run
from fem.cli.answer import AS_IT_IS, BAD_INPUT, BUG, DONE, INTERRUPTED, OPEN, VOUCHED, answering
from fem.cli.tables import show_end, show_record
from fem.cli.watch import Watch
from fem.docket.content import content_hash
from fem.docket.file import read_docket
from fem.errors import DocketError, Problem, StoreError, SystemLibraryMissing
from fem.results import store
from fem.results.numbers import Writer
from fem.results.record import TurnNote
from fem.results.verdicts import Call
from fem.stock import library

ROOT = Path(cli.__file__).parents[2]
DOCKET = """
[docket]
format = 1
title = "Bar in a warm room"
length = "mm"
time = "min"
temperature = "degC"

[section]
kind = "planar"

[[region]]
name = "bar"
stock = "my steel"
outline = [[0, 0, "bottom"], [100, 0, "right"], [100, 50, "top"], [0, 50, "left"]]

[stock."my steel"]
conductivity = 40
density = 7800
specific_heat = 500
range = [0, 800]
source = "typed by hand"

[[exposure]]
name = "room"
on = "bar.*"
film = { coefficient = 25, ambient = { points = [[0, 20], [5, 60], [5, 50], [10, 50]] } }

[clock]
end = 10
report_every = 1

[start]
everywhere = 20

[[gauge]]
name = "middle"
at = [50, 25]

[[gauge]]
name = "skin"
at = [50, 50]

[[limit]]
name = "stays cool"
at = "middle"
must = "stay below"
temperature = 55

[wanted]
gauges = 2

[[variant]]
name = "heavy"
[variant.changes]
"stock.my steel.density" = 9000
"""


@pytest.fixture
def docket(tmp_path):
    path = tmp_path / "bar.docket.toml"
    path.write_text(DOCKET, encoding="utf-8")
    return path


def call(*words):
    return CliRunner().invoke(cli.app, [str(word) for word in words])


@pytest.fixture
def made(monkeypatch, record):
    """Put a hand-made record in the place of the work; say how often work was asked for."""
    calls = []

    def work(docket, kind):
        calls.append(kind)
        reasons = record.reasons if made_standing[0] == "open" else ()
        return replace(
            record,
            kind=kind,
            content_hash=content_hash(docket),
            standing=made_standing[0],
            reasons=reasons,
            outcome=made_standing[1],
            versions={"heatvouch": cli_run._version()},
        )

    made_standing = ["vouched", "finished"]
    monkeypatch.setattr(cli_run, "_work", work)
    return SimpleNamespace(calls=calls, state=made_standing)


# --- help -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "words",
    [
        [],
        ["check"],
        ["look"],
        ["vouch"],
        ["export"],
        ["stock"],
        ["stock", "list"],
        ["stock", "show"],
        ["stock", "plot"],
    ],
)
def test_help_gives_examples_and_exit_codes(words):
    told = call(*words, "--help")
    assert told.exit_code == DONE
    assert f"heatvouch {' '.join(words)}".strip() in told.output
    assert "Examples" in told.output
    if words != ["stock"]:
        for code in (VOUCHED, OPEN, BAD_INPUT, INTERRUPTED, BUG):
            assert f"{code}  " in told.output


@pytest.mark.parametrize("words", [[], ["check"], ["vouch"], ["export"], ["stock"], ["stock", "list"]])
def test_each_example_of_help_has_a_line_of_its_own(words):
    lines = [line.strip() for line in call(*words, "--help").output.splitlines()]
    assert not [line for line in lines if "\\b" in line]
    examples = lines[lines.index("Examples") + 1 :]
    examples = examples[: examples.index("")]
    assert len(examples) > 1
    for line in examples:
        assert line.startswith("heatvouch ")
        assert line.count("heatvouch") == 1


def test_reader_that_leaves_early_ends_the_program_quietly():
    """128 + 13 is what a POSIX shell says of a program that SIGPIPE ended (XCU 2.8.2)."""
    line = f"set -o pipefail; COLUMNS=100 {sys.executable} -m fem.cli.app stock list --json | head -c 1"
    told = subprocess.run(["bash", "-c", line], cwd=ROOT, capture_output=True, text=True, check=False)
    assert (told.returncode, told.stdout, told.stderr) == (141, "{", "")


def test_help_tells_what_a_limit_not_met_ends_in():
    told = " ".join(call("vouch", "--help").output.split())
    assert "0 vouched, also where a limit is vouched to be not met" in told


def test_no_command_prints_help():
    assert call().exit_code == DONE
    assert call().output == call("--help").output
    assert call("stock").output == call("stock", "--help").output


def test_help_comes_within_a_second_and_loads_nothing_heavy():
    """Best of three, in a fresh process each: other work on the machine must not count."""
    took = []
    for _ in range(3):
        began = time.perf_counter()
        run = [sys.executable, "-X", "importtime", "-m", "fem.cli.app", "--help"]
        told = subprocess.run(run, cwd=ROOT, capture_output=True, text=True, check=True)
        took.append(time.perf_counter() - began)
    assert min(took) < 1.0
    loaded = {line.rsplit("|", 1)[-1].strip() for line in told.stderr.splitlines()}
    assert not loaded & {"numpy", "scipy", "pydantic", "rich.table", "gmsh", "skfem", "matplotlib"}


def test_unknown_command_and_option_are_bad_input():
    assert call("frobnicate").exit_code == BAD_INPUT
    assert call("look").exit_code == BAD_INPUT
    assert call("look", "x.docket.toml", "--colour").exit_code == BAD_INPUT


# --- reading --------------------------------------------------------------------------------------


def test_every_problem_is_told_with_place_value_and_remedy(tmp_path):
    bad = DOCKET.replace("conductivity = 40", "conductivity = -40").replace('kind = "planar"', 'kind = "round"')
    path = tmp_path / "bad.docket.toml"
    path.write_text(bad.replace("at = [50, 25]", 'at = [50, "7,5 mm"]'))
    told = call("vouch", path)
    assert told.exit_code == BAD_INPUT
    assert "Traceback" not in told.output
    assert told.output.startswith("3 problems; nothing was computed.")
    for word in ("bad.docket.toml", "my steel", "-40", "round", "7,5 mm", "decimal point", "allowed", "to mend"):
        assert word in told.output, word


def test_problems_come_as_json_too(tmp_path):
    path = tmp_path / "bad.docket.toml"
    path.write_text(DOCKET.replace("conductivity = 40", "conductivity = -40"))
    told = call("look", path, "--json")
    assert told.exit_code == BAD_INPUT
    (problem,) = json.loads(told.stdout)["problems"]
    assert problem["file"] == "bad.docket.toml"
    assert set(problem) == {"place", "value", "allowed", "hint", "file", "xy", "spot"}


def test_missing_docket_is_bad_input(tmp_path):
    told = call("check", tmp_path / "nothing.docket.toml")
    assert told.exit_code == BAD_INPUT
    assert "No such file" in told.output


def test_unknown_variant_is_bad_input(docket):
    told = call("vouch", docket, "--variant", "light")
    assert told.exit_code == BAD_INPUT
    assert "heavy" in told.output


def test_options_change_the_docket_and_its_hash(docket):
    plain = read_docket(docket)
    changed = cli_run.read(cli_run.asked_for(docket, band="0.5", cells=5000, seconds=7.0))
    assert changed.wanted.gauges == 0.5
    assert (changed.allowance.cells, changed.allowance.seconds) == (5000, 7.0)
    hashes = {content_hash(d) for d in (plain, changed, plain.variant("heavy"))}
    assert len(hashes) == 3
    text = cli_run.read(cli_run.asked_for(docket, band="0.9 degF"))
    assert text.wanted.gauges == pytest.approx(0.5, rel=1e-15)  # 9/5 degF is 1 K exactly
    assert cli_run.read(cli_run.asked_for(docket)) == plain


@pytest.mark.parametrize(
    ("option", "value"), [("--band", "2 kg"), ("--band", "-1"), ("--cells", "1"), ("--seconds", "0")]
)
def test_options_out_of_bounds_are_refused(docket, option, value):
    told = call("vouch", docket, option, value)
    assert told.exit_code == BAD_INPUT
    assert "command line" in told.output


# --- the shelf ------------------------------------------------------------------------------------


def test_vouch_keeps_its_record_and_reads_it_the_next_time(docket, made):
    first = call("vouch", docket)
    assert first.exit_code == VOUCHED
    folder = docket.with_name("bar.records") / f"vouch-{content_hash(read_docket(docket))[:12]}"
    assert store.load(folder).kind == "vouch"
    second = call("vouch", docket)
    assert made.calls == ["vouch"]
    assert "--again" in second.output
    assert first.stdout == second.stdout
    call("vouch", docket, "--again")
    call("vouch", docket, "--variant", "heavy")
    call("look", docket)
    assert made.calls == ["vouch", "vouch", "vouch", "quick look"]


def test_changed_docket_is_run_again(docket, made):
    call("vouch", docket)
    docket.write_text(DOCKET.replace("7800", "7801"))
    call("vouch", docket)
    assert made.calls == ["vouch", "vouch"]


def test_comment_and_title_are_no_reason_to_run_again(docket, made):
    call("vouch", docket)
    docket.write_text("# a thought\n" + DOCKET.replace("warm room", "room"))
    call("vouch", docket)
    assert made.calls == ["vouch"]


def test_damaged_record_is_told_and_made_anew(docket, made):
    call("vouch", docket)
    (folder,) = docket.with_name("bar.records").iterdir()
    (folder / "fields.npz").write_bytes(b"")
    told = call("vouch", docket)
    assert told.exit_code == VOUCHED
    assert "damaged" in told.output
    assert made.calls == ["vouch", "vouch"]
    assert store.load(folder)


def test_interrupted_work_is_kept_apart_and_done_anew(docket, made):
    made.state[1] = "interrupted"
    assert call("vouch", docket).exit_code == INTERRUPTED
    (folder,) = docket.with_name("bar.records").iterdir()
    assert folder.name.endswith("-interrupted")
    assert store.load(folder).outcome == "interrupted"
    made.state[1] = "finished"
    assert call("vouch", docket).exit_code == VOUCHED
    assert made.calls == ["vouch", "vouch"]


def test_work_that_the_allowance_ended_is_never_served_as_done(docket, made):
    made.state[:] = ["open", "the allowance of seconds ran out in the first study"]
    assert call("vouch", docket).exit_code == OPEN
    (folder,) = docket.with_name("bar.records").iterdir()
    assert folder.name.endswith("-unfinished")
    told = call("vouch", docket)
    assert "did not finish" in told.output
    assert "read from the shelf" not in told.output
    assert made.calls == ["vouch", "vouch"]
    assert call("export", docket, "--to", docket.parent / "out").exit_code == BAD_INPUT


def test_unfinished_record_in_the_place_of_a_finished_one_is_not_found(docket, record):
    shelf = store.shelf_of(docket)
    for outcome, found in (("newton did not converge", False), ("finished", True)):
        folder = store.place_on(shelf, record.content_hash, "vouch")
        store.save(replace(record, outcome=outcome), folder)
        assert (store.find(shelf, record.content_hash, "vouch") is not None) == found


def test_open_record_from_the_shelf_says_so(docket, made, record):
    made.state[0] = "open"
    call("vouch", docket)
    told = call("vouch", docket)
    assert made.calls == ["vouch"]
    (first, *others) = record.reasons
    assert f"This vouch is open: {Writer.of(record).words(first.text)}" in told.output
    assert f"(and {len(others)} more)" in told.output or not others
    assert record.turns[-1].then not in told.output.split("Gauges")[0]
    made.state[0] = "vouched"
    call("vouch", docket, "--again")
    assert "This vouch is open" not in call("vouch", docket).output


def test_shelf_that_cannot_be_written_is_refused_before_the_work(docket, made, monkeypatch):
    monkeypatch.setattr(cli_run.os, "access", lambda _, mode: mode != os.W_OK)  # root may write anywhere
    told = call("vouch", docket)
    assert told.exit_code == BAD_INPUT
    assert "cannot be kept" in told.output
    assert made.calls == []


def test_full_disk_after_the_work_still_shows_the_numbers(docket, made, monkeypatch):
    def full(*_):
        raise StoreError("the record could not be written: No space left on device")

    monkeypatch.setattr(store, "save", full)
    told = call("vouch", docket)
    assert told.exit_code == BAD_INPUT
    assert "206.85 ± 0.60 °C" in told.output
    assert "not kept" in told.output
    assert "No space left" in told.output


def test_record_of_another_version_is_told(docket, made, monkeypatch):
    call("vouch", docket)
    monkeypatch.setattr(cli_run, "_version", lambda: "9.9")
    assert "this is 9.9" in call("vouch", docket).output


# --- check


def test_check_tells_what_the_docket_says(docket):
    told = call("check", docket)
    assert told.exit_code == DONE
    for words in ("5000 mm²", "my steel", "ambient 20 to 60 °C over time, 1 jump ", "film 25 W/(m² K)"):
        assert words in told.output, words
    assert "kink" not in told.output
    assert "0 to 10 min" in told.output
    assert "border of bar" in told.output
    assert "nothing wrong was found" in told.output


def test_check_tells_each_exposure_once(docket):
    both = 'radiant = { emissivity = 0.8, surroundings = 40 }\non = ["bar.bottom", "bar.left"]'
    docket.write_text(DOCKET.replace('on = "bar.*"', both))
    (room,) = json.loads(call("check", docket, "--json").stdout)["exposures"]
    assert room["on"] == ["bar.bottom", "bar.left"]
    assert room["length"] == pytest.approx(150.0, rel=1e-12)  # 100 mm and 50 mm
    assert call("check", docket).output.count("emissivity") == 1


@pytest.mark.parametrize(("unit", "asks"), [("m", True), ("mm", False), ("cm", False)])
def test_check_asks_about_a_section_of_odd_size(docket, unit, asks):
    docket.write_text(DOCKET.replace('length = "mm"', f'length = "{unit}"'))
    told = call("check", docket).output
    assert ("is the unit of length right?" in told) == asks
    assert ("111.8 m across" in told) == asks  # the diagonal of 100 by 50


def test_check_notes_that_two_exposures_on_an_edge_add_up(docket):
    sun = '[[exposure]]\nname = "sun"\non = "bar.bottom"\nflux = 800\n'
    docket.write_text(DOCKET + sun)
    (note,) = json.loads(call("check", docket, "--json").stdout)["notes"]
    assert note.startswith("bar.bottom faces room and sun")
    assert "adds up" in note
    docket.write_text(DOCKET)
    assert json.loads(call("check", docket, "--json").stdout)["notes"] == []


@pytest.mark.parametrize(("unit", "limit", "asks"), [("K", 55, True), ("K", 355, False), ("degC", 55, False)])
def test_check_asks_about_kelvin_that_look_like_celsius(docket, unit, limit, asks):
    text = DOCKET.replace('temperature = "degC"', f'temperature = "{unit}"')
    docket.write_text(text.replace("temperature = 55", f"temperature = {limit}"))
    notes = json.loads(call("check", docket, "--json").stdout)["notes"]
    assert [note for note in notes if "are they in °C?" in note] == notes
    assert bool(notes) == asks


@pytest.mark.parametrize(("instants", "says"), [("[]", "1 break to land on"), ("[3]", "2 breaks to land on")])
def test_check_counts_breaks_in_good_grammar(docket, instants, says):
    docket.write_text(DOCKET.replace("report_every = 1", f"report_every = 1\ninstants = {instants}"))
    assert says in call("check", docket).output


@pytest.mark.parametrize(
    ("name", "meant"),
    [("nosuch", ()), ("mineral wool", ("mineral wool",)), ("", ()), ("fireclay brik", ("fireclay brick",))],
)
def test_unknown_stock_suggests_names_with_its_words_first(name, meant):
    told = " ".join(call("stock", "show", name).output.split())
    suggested = re.findall(r'"([^"]+)"', told.partition("did you mean")[2])
    assert bool(suggested) == bool(meant)
    assert all(words in label for words in meant for label in suggested)


def test_names_that_look_like_emoji_or_markup_are_shown_as_they_are(docket):
    text = DOCKET.replace("Bar in a warm room", ":brick: [bold]room").replace('name = "skin"', 'name = ":fire:"')
    docket.write_text(text)
    told = call("check", docket).output
    assert ":brick: [bold]room" in told
    assert ":fire:" in told


def test_stretches_are_told_in_words(docket):
    docket.write_text(DOCKET.replace('on = "bar.*"', 'on = { region = "bar", start = [100, 10], end = [100, 40] }'))
    told = call("check", docket).output
    assert "bar, (100, 10) to (100, 40) mm" in told
    assert "stretch:" not in told


def test_crossing_outline_is_told_in_the_dockets_units(docket):
    docket.write_text(DOCKET.replace('[100, 50, "top"], [0, 50, "left"]', '[0, 50, "top"], [100, 50, "left"]'))
    told = call("check", docket)
    assert told.exit_code == BAD_INPUT
    assert "(50, 25) mm" in told.output  # where the diagonals of the bar meet
    assert " m," not in told.output


def test_check_as_json_holds_numbers_in_the_dockets_units(docket):
    known = json.loads(call("check", docket, "--json").stdout)
    assert known["units"] == {"length": "mm", "time": "min", "temperature": "degC", "difference": "K"}
    (bar,) = known["regions"]
    assert bar["area"] == pytest.approx(5000.0, rel=1e-12)  # 100 mm by 50 mm
    assert {e["name"]: e["length"] for e in known["edges"]} == pytest.approx(
        {"bar.bottom": 100.0, "bar.right": 50.0, "bar.top": 100.0, "bar.left": 50.0}, rel=1e-12
    )
    assert {tuple(e["faces"]) for e in known["edges"]} == {("room",)}
    ambient = known["exposures"][0]["values"]["ambient"]
    assert (ambient["lowest"], ambient["highest"]) == pytest.approx((20.0, 60.0), abs=1e-9)
    assert (ambient["jumps"], ambient["unit"]) == (1, "degC")
    assert [g["region"] for g in known["gauges"]] == ["bar", "border of bar"]
    assert known["clock"]["end"] == pytest.approx(10.0)


def test_check_documents_every_key(docket):
    from fem.cli.check import found_in

    known = json.loads(call("check", docket, "--json").stdout)
    for key in known:
        assert key in found_in.__doc__, key


def test_check_of_a_variant_shows_the_variant(docket):
    plain, heavy = (json.loads(call("check", docket, "--json", *more).stdout) for more in ((), ("--variant", "heavy")))
    assert plain["content_hash"] != heavy["content_hash"]
    assert "heavy" in heavy["title"]


def test_check_refuses_a_gauge_outside(docket):
    docket.write_text(DOCKET.replace("at = [50, 25]", "at = [50, 51]"))
    told = call("check", docket)
    assert told.exit_code == BAD_INPUT
    assert 'gauge "middle"' in told.output
    assert "(50, 51) mm" in told.output
    assert "bar.docket.toml" in told.output


def test_vouch_refuses_a_gauge_outside_in_the_same_way(docket):
    docket.write_text(DOCKET.replace("at = [50, 25]", "at = [50, 51]"))
    assert call("vouch", docket).output == call("check", docket).output


def test_check_refuses_a_section_without_meaning(docket):
    docket.write_text(DOCKET.replace('[100, 50, "top"]', '[0, 20, "top"]').replace("[0, 50,", "[100, 50,"))
    told = call("check", docket)
    assert told.exit_code == BAD_INPUT
    assert "Traceback" not in told.output
    assert "bar" in told.output


# --- the whole way


@pytest.fixture
def start():
    """Start commands in processes of their own; none outlives its test."""
    running = []

    def begin(*words):
        running.append(
            subprocess.Popen(
                [sys.executable, "-m", "fem.cli.app", *map(str, words)],
                cwd=ROOT,
                stdout=subprocess.PIPE,
                stderr=subprocess.PIPE,
                text=True,
                env={**os.environ, "OPENBLAS_NUM_THREADS": "1"},
            )
        )
        return running[-1]

    yield begin
    for work in running:
        work.kill()
        work.communicate()


def test_docket_to_vouched_record_and_export(docket, start, tmp_path):
    work = start("vouch", docket, "--json")
    output, progress = work.communicate(timeout=60)
    assert work.returncode == VOUCHED, progress
    known = json.loads(output)
    assert known["standing"] == "vouched"
    assert "turn 1" in progress
    assert "found:" in progress
    record = store.load(Path(known["record"]))
    assert record.content_hash == content_hash(read_docket(docket))
    assert call("export", docket, "--what", "histories,fields,mesh", "--to", tmp_path / "out").exit_code == DONE
    # Nothing can be hotter than the warmest that it faces, nor colder than the coldest (maximum principle).
    for series in known["series"]:
        if series["unit"] == "degC":
            assert series["highest"]["value"] <= 60.0 + series["highest"]["band"]
            assert series["lowest"]["value"] >= 20.0 - series["lowest"]["band"]


def test_quick_look_finishes_with_code_zero(docket):
    told = call("look", docket)
    assert told.exit_code == DONE
    assert "no band (quick look)" in told.stdout


def wait_for(work, words):
    """Return what the error stream said up to the line with the words."""
    said = ""
    while words not in said:
        line = work.stderr.readline()
        assert line, said
        said += line
    return said


LONG = ("--band", "0.00001", "--cells", "2000000", "--seconds", "300")
"""Narrower than any mesh within reach can give: the work would go on for minutes."""


def test_interrupt_leaves_a_record_that_can_be_read(docket, start):
    work = start("vouch", docket, *LONG)
    wait_for(work, "turn 1")
    work.send_signal(signal.SIGINT)
    output, progress = work.communicate(timeout=60)
    assert work.returncode == INTERRUPTED, progress
    assert "what was earned is kept" in progress
    assert "outcome: interrupted" in output
    (folder,) = docket.with_name("bar.records").iterdir()
    record = store.load(folder)
    assert record.outcome == "interrupted"
    assert record.standing == "open"
    assert math.isfinite(float(record.figures.band.max()))  # the turn before was whole


def test_second_interrupt_ends_at_once_and_leaves_nothing_half_written(docket, start):
    work = start("vouch", docket, *LONG)
    wait_for(work, "turn 1")
    work.send_signal(signal.SIGINT)
    wait_for(work, "Ctrl-C again")
    work.send_signal(signal.SIGINT)
    work.communicate(timeout=60)
    assert work.returncode == INTERRUPTED
    shelf = docket.with_name("bar.records")
    for folder in shelf.iterdir() if shelf.exists() else ():
        store.load(folder)  # the first Ctrl-C may have been quicker; what is there is whole


# --- exit codes -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("command", "standing", "outcome", "code"),
    [
        ("vouch", "vouched", "finished", VOUCHED),
        ("vouch", "open", "finished", OPEN),
        ("vouch", "open", "interrupted", INTERRUPTED),
        ("vouch", "open", "the allowance ran out", OPEN),
        ("look", "open", "finished", DONE),
        ("look", "open", "interrupted", INTERRUPTED),
        ("look", "open", "newton did not converge", OPEN),
    ],
)
def test_exit_code_tells_the_standing(docket, made, command, standing, outcome, code):
    made.state[:] = [standing, outcome]
    assert call(command, docket).exit_code == code
    assert call(command, docket, "--json").exit_code == code


def test_missing_system_library_is_one_line(docket, monkeypatch):
    def missing(*_):
        raise SystemLibraryMissing("libGLU.so.1: cannot open shared object file")

    monkeypatch.setattr(cli_run, "_work", missing)
    told = call("look", docket)
    assert told.exit_code == BAD_INPUT
    assert len(told.output.strip().splitlines()) == 1
    assert "apt-get install libgl1" in told.output


def test_machine_without_the_library_gets_the_line_and_no_trace(docket, tmp_path):
    """As the loader of a bare machine would have it: importing gmsh raises OSError."""
    (tmp_path / "gmsh.py").write_text('raise OSError("libGLU.so.1: cannot open shared object file")')
    path = os.pathsep.join((str(tmp_path), str(ROOT)))
    words = [sys.executable, "-m", "fem.cli.app", "look", str(docket)]
    told = subprocess.run(
        words, cwd=tmp_path, env={**os.environ, "PYTHONPATH": path}, capture_output=True, text=True, check=False
    )
    assert told.returncode == BAD_INPUT
    (line,) = told.stderr.strip().splitlines()
    assert "libGLU.so.1" in line
    assert "libglu1-mesa" in line
    assert told.stdout == ""


def test_abort_is_told_and_keeps_nothing(docket, monkeypatch):
    def abort(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr(cli_run, "_work", abort)
    told = call("vouch", docket)
    assert told.exit_code == INTERRUPTED
    assert "nothing of this work was kept" in told.output
    assert not docket.with_name("bar.records").exists()


def test_our_bug_keeps_its_trace_and_is_no_standing(docket, monkeypatch, capsys):
    def broken(*_):
        raise ZeroDivisionError("a planted bug")

    monkeypatch.setattr(cli_run, "_work", broken)
    monkeypatch.setattr(sys, "argv", ["heatvouch", "look", str(docket)])
    with pytest.raises(SystemExit) as ended:
        cli.main()
    assert ended.value.code == BUG
    assert "Traceback" in capsys.readouterr().err
    with pytest.raises(ZeroDivisionError), answering(as_json=False):
        broken()


def test_problem_shows_its_spot():
    told = CliRunner()
    import typer

    app = typer.Typer(rich_markup_mode=None, pretty_exceptions_enable=False)

    @app.command()
    def one():
        with answering(as_json=False):
            raise DocketError([Problem('region "deck"', "a knot", "no knots", "untie it", "f.toml", (0.1, 0.2))])

    result = told.invoke(app, [])
    assert result.exit_code == BAD_INPUT
    assert "x = 0.1 m, y = 0.2 m" in result.output


# --- what is shown --------------------------------------------------------------------------------


def shown(record, width=120):
    console = Console(width=width, record=True, file=io.StringIO(), **AS_IT_IS)
    show_record(console, record)
    show_end(console, record, "bar.records/vouch-3f")
    return console.export_text()


def test_vouch_ends_with_all_that_must_be_seen(record):
    text = shown(record, width=160)
    for words in (
        "206.85 ± 0.60 °C",
        "at 20 min",
        "826.9 ± 1.5 °C",
        "steel keeps its strength",
        "met",
        "+143.15 ± 0.60 K",
        "too close to call",
        "+1.0 ± 1.4 K",
        "0.71 bands",
        "-6.00 ± 0.12 K/min",
        "50 bands",
        "19 min at the earliest",
        "14.200 ± 0.018 MJ/m",
        "kiln on deck.top",
        "unexplained",
        "3.3e-06 %",
        "keeps it open",
        "(100, 0) mm",
        "Standing: open",
        "to close it: round the corner",
        "Record: bar.records/vouch-3f",
        "A result is its user's responsibility.",
        "Local codes and licensed practice decide",
    ):
        assert words in " ".join(text.split()) or words in text, words


def test_quick_look_marks_every_temperature(quick):
    text = shown(quick)
    assert "no band (quick look)" in text
    assert "±" not in text
    for line in text.splitlines():
        assert line.count("°C") == line.count("°C, no band") or "below" in line or "reaches" in line, line
    assert "no verdict: no band" in text
    assert "too close" not in text


def test_ledger_tells_each_edge_of_an_exposure(record):
    edges = (("kiln on deck.top", 1.2e7), ("kiln on deck.left", 2.2e6))
    text = shown(replace(record, ledger=replace(record.ledger, through=edges)))
    assert "in through kiln, all its edges   14.200 ± 0.018 MJ/m" in text
    assert "of it on deck.top" in text
    assert "2.2 MJ/m" in text


def test_ledger_names_stretches_in_words(record):
    label = "kiln on stretch:deck:0.5,0.06:0.5,0.114"
    told = shown(replace(record, ledger=replace(record.ledger, through=((label, 1.42e7),))))
    assert "in through kiln on deck, (500, 60) to (500, 114) mm" in told


def test_limit_without_a_value_has_no_instant(record):
    unknown = replace(record.verdicts[0], call=Call.too_close, margin=math.nan, band=math.inf)
    told = shown(replace(record, verdicts=(unknown,), outcome="interrupted"))
    assert "no value" in told
    assert "tightest" not in told


def test_work_that_stopped_early_is_not_taken_for_the_end(quick):
    text = shown(replace(quick, kind="vouch", outcome="interrupted"))
    assert "no band: the work ended before there were runs to compare" in text
    assert "outcome: interrupted" in text
    assert "where it stopped" in text
    assert "at the end" not in text


def test_narrow_terminal_loses_no_number(record):
    text = "".join(shown(record, width=80).split())
    for words in ("206.85±0.60°C", "143.15±0.60K", "14.200±0.018MJ/m"):
        assert words in text


def test_steady_state_has_no_times(record):
    text = shown(replace(record, steady=True, figures=replace(record.figures)))
    assert "min" not in text.replace("K/min", "").replace("10 K", "")
    assert "196.85 ± 0.59 °C" in text


def test_cool_job_needs_no_caution(record):
    cool = replace(record, fields=replace(record.fields, peak=record.fields.peak * 0 + 300.0))
    assert "Local codes" not in shown(cool)
    assert "A result is its user's responsibility." in shown(cool)


def test_names_with_brackets_are_shown_as_they_are(record):
    verdict = replace(record.verdicts[0], limit="[red]cold[/red]", text="[bold]", call=Call.met, band=math.inf)
    text = shown(replace(record, title="[dim]x", verdicts=(verdict,)))
    assert "[red]cold[/red]" in text
    assert "[dim]x" in text


def test_json_is_alone_on_the_output(docket, made):
    told = call("vouch", docket, "--json")
    known = json.loads(told.stdout)
    assert known["record"].endswith("vouch-" + known["content_hash"][:12])
    assert known["standing"] == "vouched"


# --- watching -------------------------------------------------------------------------------------


class Work:
    def __init__(self, doing, fraction, seconds_left):
        self.doing, self.fraction, self.seconds_left = doing, fraction, seconds_left


def test_plain_lines_tell_each_piece_of_work_once(capsys):
    with Watch(Console(stderr=True, width=120)) as watch:
        for i in range(50):
            watch.on_progress(Work("first mesh", i / 50, None))
        watch.on_progress(Work("cells halved", 0.5, 12.0))
        watch.on_turn(TurnNote("widest: gauge [x]", "split every cell", 64, 30, 1.5))
    told = capsys.readouterr().err.splitlines()
    assert told[0] == "first mesh: 0 %"
    assert told[1] == "cells halved: 50 %, 12 s left"
    assert told[2].startswith("turn 1")
    assert told[3:] == ["  found: widest: gauge [x]", "  next:  split every cell"]


def test_bar_shows_work_and_time_left():
    console = Console(stderr=True, width=120, force_terminal=True, record=True)
    with Watch(console) as watch:
        watch.on_progress(Work("cells halved", 0.5, 12.0))
        watch._bar.refresh()
        watch.on_turn(TurnNote("found it", "go on", 64, 30, 1.5))
    text = console.export_text()
    assert "turn 1" in text
    rendered = watch._bar.make_tasks_table(watch._bar.tasks)
    probe = Console(width=120, record=True, file=io.StringIO())
    probe.print(rendered)
    text = probe.export_text()
    assert "cells halved" in text
    assert "50%" in text
    assert "12 s left" in text


def test_first_interrupt_asks_to_stop_and_the_second_aborts(capfd):
    before = signal.getsignal(signal.SIGINT)
    with Watch(Console(stderr=True)) as watch:
        assert not watch.stop()
        os.kill(os.getpid(), signal.SIGINT)
        assert watch.stop()
        assert "what was earned is kept" in capfd.readouterr().err
        with pytest.raises(KeyboardInterrupt):
            os.kill(os.getpid(), signal.SIGINT)
    assert signal.getsignal(signal.SIGINT) is before


# --- stock ----------------------------------------------------------------------------------------


def test_stock_list_finds_and_says_when_nothing_fits():
    known = json.loads(call("stock", "list", "--json").stdout)["stock"]
    assert [s["name"] for s in known] == list(library())
    told = call("stock", "list", "brick")
    assert "fireclay brick" in told.output
    assert call("stock", "list", "unobtainium").exit_code == DONE
    assert "no stock" in call("stock", "list", "unobtainium").output


def test_every_stock_can_be_shown_with_its_sources():
    for stock in library().values():
        known = json.loads(call("stock", "show", stock.name, "--json").stdout)
        for part in known["properties"].values():
            assert part["source"]
            assert part["kind"]
            assert (part["table"] is None) != (part["constant"] is None)
    told = " ".join(call("stock", "show", "fireclay brick").output.split())
    source, kind = library()["fireclay brick"].source_of("conductivity")
    assert kind in told
    assert source[:40] in told


def test_stock_show_has_the_rows_that_are_stated():
    def rows(name):
        lines = call("stock", "show", name).output.split("diffusivity, mm²/s", 1)[1].split("Sources")[0]
        return [line.split() for line in lines.splitlines() if line.strip()]

    granite = library()["granite"]
    ((*reach, k, rho, c, _),) = rows("granite")
    assert [float(x) for x in (k, rho, c)] == [own.value for own in granite.properties().values()]
    assert reach[1] == "to"
    brick = library()["fireclay brick"].properties()
    stated = sorted({round(float(T) - 273.15, 6) for own in brick.values() for T in own.rows()[0]})
    assert [float(row[0]) for row in rows("fireclay brick")] == pytest.approx(stated)


def test_stock_list_breaks_no_name_into_many_lines(monkeypatch):
    monkeypatch.setenv("COLUMNS", "100")
    lines = [line[1:27].rstrip() for line in call("stock", "list").output.splitlines()]
    for name in library():
        starts = [i for i, line in enumerate(lines) if line and name.startswith(line)]
        assert any(" ".join(" ".join(lines[i : i + 2]).split()).startswith(name) for i in starts), name


def test_unknown_stock_is_refused_with_the_nearest():
    told = call("stock", "show", "fireclay brik")
    assert told.exit_code == BAD_INPUT
    assert '"fireclay brick"' in told.output


def test_stock_plot_writes_a_picture(tmp_path):
    target = tmp_path / "brick.png"
    assert call("stock", "plot", "fireclay brick", "--to", target).exit_code == DONE
    assert target.read_bytes()[:8] == b"\x89PNG\r\n\x1a\n"  # PNG specification, 5.2
    assert call("stock", "plot", "fireclay brick", "--to", tmp_path / "brick.jpg").exit_code == BAD_INPUT
    told = call("stock", "plot", "fireclay brick", "--to", tmp_path / "no" / "brick.png")
    assert told.exit_code == BAD_INPUT
    assert "could not be written" in told.output


# --- export ---------------------------------------------------------------------------------------


def test_export_writes_what_is_asked_from_the_shelf(docket, made, tmp_path):
    call("vouch", docket)
    to = tmp_path / "results"
    told = call("export", docket, "--what", "histories,fields,mesh,docket,figures", "--to", to, "--json")
    assert told.exit_code == DONE
    names = {path.name for path in to.iterdir()}
    assert names == {"histories.csv", "fields", "mesh.msh", "bar.zip", "figures.json"}
    assert {Path(path).name for path in json.loads(told.stdout)["written"]} == names
    assert content_hash(read_docket(to / "bar.zip")) == content_hash(read_docket(docket))


def test_export_prefers_the_vouch_to_the_quick_look(docket, made, tmp_path):
    call("look", docket)
    call("export", docket, "--what", "figures", "--to", tmp_path / "a")
    assert json.loads((tmp_path / "a" / "figures.json").read_text())["kind"] == "quick look"
    call("vouch", docket)
    call("export", docket, "--what", "figures", "--to", tmp_path / "b")
    assert json.loads((tmp_path / "b" / "figures.json").read_text())["kind"] == "vouch"


def test_export_takes_a_named_record(docket, made, tmp_path):
    made.state[1] = "interrupted"
    call("vouch", docket)
    assert call("export", docket, "--to", tmp_path / "a").exit_code == BAD_INPUT
    (folder,) = docket.with_name("bar.records").iterdir()
    assert call("export", docket, "--record", folder, "--to", tmp_path / "a").exit_code == DONE
    assert "outcome: interrupted" in (tmp_path / "a" / "histories.csv").read_text()


def test_export_without_a_record_says_what_to_do(docket, tmp_path):
    told = call("export", docket, "--to", tmp_path / "a")
    assert told.exit_code == BAD_INPUT
    assert "heatvouch vouch" in told.output
    assert not (tmp_path / "a").exists()


def test_export_of_an_unknown_part_is_refused(docket):
    told = call("export", docket, "--what", "histories,movie")
    assert told.exit_code == BAD_INPUT
    assert "movie" in told.output


def test_packed_docket_is_packed_again_as_it_is(docket, made, tmp_path):
    call("export", docket, "--what", "docket", "--to", tmp_path / "a")
    told = call("export", tmp_path / "a" / "bar.zip", "--what", "docket", "--to", tmp_path / "b")
    assert told.exit_code == DONE
    assert (tmp_path / "b" / "bar.zip").read_bytes() == (tmp_path / "a" / "bar.zip").read_bytes()
