"""What is exported can be read back by other programs, in the docket's units, and says what it is worth."""

import csv
import json
import xml.etree.ElementTree as ET
from dataclasses import replace

import meshio
import numpy as np
import pytest

from fem.errors import StoreError
from fem.export.figures import figures_of
from fem.export.write import WRITERS, export
from fem.results.cautions import cautions
from fem.results.plain_json import as_json


def read_histories(path):
    lines = path.read_text(encoding="utf-8").splitlines()
    comments = [line for line in lines if line.startswith("#")]
    rows = list(csv.reader(line for line in lines if not line.startswith("#")))
    return comments, rows[0], rows[1:]


def test_histories_are_in_the_dockets_units(record, tmp_path):
    (path,) = export(record, ["histories"], tmp_path)
    _, header, rows = read_histories(path)
    assert header[:4] == ["time [min]", "reported", "gauge beam web [degC]", "gauge beam web, band [K]"]
    assert len(header) == 2 + 4 * len(record.figures.keys)
    # Ten digits are written: 1e-9 of the value at most is lost.
    np.testing.assert_allclose([float(r[0]) for r in rows], record.figures.grid.t / 60.0, rtol=1e-9)
    np.testing.assert_allclose([float(r[2]) for r in rows], record.figures.value[0] - 273.15, rtol=1e-9)
    np.testing.assert_allclose([float(r[3]) for r in rows], record.figures.band[0], rtol=1e-9)
    flow = header.index("heat flow in through kiln [W/m]")
    np.testing.assert_allclose([float(r[flow]) for r in rows], record.figures.value[4], rtol=1e-9)
    assert [r[1] for r in rows] == ["0", "1", "0", "1", "1"]


def test_histories_add_up_part_by_part(record, tmp_path):
    (path,) = export(record, ["histories"], tmp_path)
    _, header, rows = read_histories(path)
    for i, name in enumerate(header):
        if name.split(" [")[0].endswith(", band"):
            band, space, time = (np.array([float(r[i + j]) for r in rows]) for j in range(3))
            np.testing.assert_allclose(band, space + time, rtol=1e-8)


def test_histories_speak_fahrenheit(record, tmp_path):
    (path,) = export(replace(record, units=("in", "h", "degF")), ["histories"], tmp_path)
    _, header, rows = read_histories(path)
    assert header[0] == "time [h]"
    assert header[2:4] == ["gauge beam web [degF]", "gauge beam web, band [degF]"]
    assert float(rows[0][2]) == pytest.approx(68.0, abs=1e-9)  # 20 °C is 68 °F exactly
    assert float(rows[1][3]) == pytest.approx(1.8 * record.figures.band[0, 1], rel=1e-9)


def test_histories_say_which_run_and_what_it_is_worth(record, quick, tmp_path):
    (path,) = export(record, ["histories"], tmp_path)
    comments, _, _ = read_histories(path)
    assert f"# docket {record.content_hash}" in comments
    assert "# standing: open" in comments
    assert any("open because: no finite band" in line for line in comments)
    (path,) = export(quick, ["histories"], tmp_path)
    comments, _, rows = read_histories(path)
    assert any("no value has a band" in line for line in comments)
    assert {r[3] for r in rows} == {""}


def test_title_of_two_lines_stays_a_comment(record, tmp_path):
    (path,) = export(replace(record, title="one\ntwo,three"), ["histories"], tmp_path)
    assert path.read_text().startswith("# one two,three\n")


def test_steady_histories_have_no_time(record, tmp_path):
    (path,) = export(replace(record, steady=True), ["histories"], tmp_path)
    assert read_histories(path)[1][0] == "gauge beam web [degC]"


def test_fields_are_a_time_series_that_a_viewer_finds(record, tmp_path):
    (folder,) = export(record, ["fields"], tmp_path)
    entries = ET.parse(folder / "fields.pvd").getroot().findall("./Collection/DataSet")
    assert [float(e.get("timestep")) for e in entries] == [0.0, 30.0]
    for entry, T in zip(entries, record.fields.T, strict=True):
        frame = meshio.read(folder / entry.get("file"))
        # Single precision: half a unit in the last place is 2**-24 of the value.
        np.testing.assert_allclose(frame.point_data["temperature [degC]"], T - 273.15, rtol=2.0**-24)
        np.testing.assert_allclose(frame.points[:, :2], 1e3 * record.mesh.points, rtol=1e-12)
        np.testing.assert_array_equal(frame.cells_dict["triangle"], record.mesh.cells)
        np.testing.assert_array_equal(frame.cell_data["region"][0], record.mesh.region)
    extremes = meshio.read(folder / "extremes.vtu")
    np.testing.assert_allclose(extremes.cell_data["doubt [K]"][0], record.fields.doubt)
    peak = record.fields.peak[record.mesh.cells].max(axis=1) - 273.15
    np.testing.assert_allclose(extremes.cell_data["peak [degC]"][0], peak)
    np.testing.assert_allclose(extremes.point_data["time of highest [min]"], record.fields.peak_time / 60.0)


def test_quick_look_has_no_doubt_to_export(quick, tmp_path):
    (folder,) = export(quick, ["fields"], tmp_path)
    assert not [name for name in meshio.read(folder / "extremes.vtu").cell_data if "doubt" in name]


def test_awkward_title_leaves_the_index_readable(record, tmp_path):
    (folder,) = export(replace(record, title='a -- b --> <c> & "d"-'), ["fields"], tmp_path)
    assert len(ET.parse(folder / "fields.pvd").getroot().findall("./Collection/DataSet")) == 2


def test_mesh_keeps_regions_and_edges_by_name(record, tmp_path):
    (path,) = export(record, ["mesh"], tmp_path)
    mesh = meshio.read(path)
    number = {name: int(tag[0]) for name, tag in mesh.field_data.items()}
    groups = mesh.cell_data_dict["gmsh:physical"]
    for i, name in enumerate(record.mesh.region_names):
        np.testing.assert_array_equal(groups["triangle"] == number[name], record.mesh.region == i)
    for label in record.mesh.facet_labels:
        np.testing.assert_array_equal(groups["line"] == number[label], np.array(record.mesh.facet_labels) == label)


def test_mesh_keeps_a_name_with_quotes(record, tmp_path):
    mesh = replace(record.mesh, region_names=('the "deck"', "beam"), facet_labels=("beam", "beam", "x.y"))
    (path,) = export(replace(record, mesh=mesh), ["mesh"], tmp_path)
    assert set(meshio.read(path).field_data) == {"the 'deck'", "beam", "edge beam", "x.y"}


def refuse(word):
    raise AssertionError(f"{word} is not JSON")


def test_figures_are_strict_json_with_units(record, tmp_path):
    (path,) = export(record, ["figures"], tmp_path)
    known = json.loads(path.read_text(encoding="utf-8"), parse_constant=refuse)
    web = known["series"][0]
    assert (web["kind"], web["name"], web["unit"], web["band_unit"]) == ("gauge", "beam web", "degC", "K")
    assert web["highest"]["value"] == pytest.approx(206.85)
    assert web["highest"]["time"] == pytest.approx(20.0)
    assert web["highest"]["earliest"] <= 20.0 <= web["highest"]["latest"]
    assert known["limits"][1]["crossing"]["latest"] is None
    assert known["limits"][2]["margin"] == pytest.approx(-6.0)  # -0.1 K/s in K/min
    assert known["limits"][2]["unit"] == "K/min"
    assert known["ledger"]["unexplained_part"] == pytest.approx(0.5 / 1.5e7)
    assert known["findings"][1]["x"] == pytest.approx(100.0)
    assert known["work"]["widest"] is None


def test_figures_document_every_key(record):
    told = figures_of.__doc__
    for key in figures_of(record):
        assert key in told, key
    for part in ("series", "limits", "findings", "turns", "reasons"):
        for key in figures_of(record)[part][0]:
            assert key in told, (part, key)


def test_quick_look_claims_nothing(quick):
    known = json.loads(as_json(figures_of(quick)), parse_constant=refuse)
    assert all(limit["verdict"] is None and limit["band"] is None for limit in known["limits"])
    assert all(s["highest"]["band"] is None and s["highest"]["earliest"] is None for s in known["series"])


def test_steady_figures_have_no_time(record):
    known = figures_of(replace(record, steady=True))
    assert all(set(s) & {"highest", "lowest"} == set() for s in known["series"])
    assert all(limit["time"] is None for limit in known["limits"])


def test_cautions_come_when_the_job_calls_for_them(record):
    cool = replace(record, fields=replace(record.fields, peak=np.full(6, 300.0)))
    assert cautions(cool) == ()
    assert any("Hot parts" in told for told in cautions(record))
    fire = '[[exposure]]\nname = "f"\non = ["a.b"]\nfilm = { coefficient = 25, ambient = { fire = "standard" } }\n'
    assert any("Fire" in told for told in cautions(replace(cool, docket_text=fire)))
    assert any("Fire" in told for told in figures_of(replace(record, docket_text=fire))["cautions"])


def test_unwritable_folder_is_said_so(record, tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(StoreError, match="broke off"):
        export(record, WRITERS, tmp_path / "file")


def test_export_that_breaks_off_leaves_no_part(record, tmp_path, monkeypatch):
    export(record, ["fields"], tmp_path)
    before = sorted(path.name for path in (tmp_path / "fields").iterdir())

    def full(*_, **__):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(meshio.Mesh, "write", full)
    with pytest.raises(StoreError, match="No space left"):
        export(record, ["fields"], tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == ["fields"]
    assert sorted(path.name for path in (tmp_path / "fields").iterdir()) == before


def test_nothing_is_left_of_a_broken_number(record):
    assert as_json({"a": [float("nan"), {"b": float("inf")}, 1.5]}).split() == [
        "{",
        '"a":',
        "[",
        "null,",
        "{",
        '"b":',
        "null",
        "},",
        "1.5",
        "]",
        "}",
    ]
