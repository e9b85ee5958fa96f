"""Logs: what is read, and every refusal with its line number."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fem.errors import DocketError
from fem.schedules import log_folder, logs
from fem.schedules.log_folder import LogFolder
from fem.schedules.logs import MAX_FAULTS, Wanted, read_samples, read_sheet

PLAIN = Wanted("t", "v", "s")


def read(text, wanted=PLAIN):
    content = text if isinstance(text, bytes) else text.encode()
    return read_samples(read_sheet(content, "kiln.csv"), wanted)


def problems(text, wanted=PLAIN):
    with pytest.raises(DocketError) as caught:
        read(text, wanted)
    return [str(p) for p in caught.value.problems]


def test_plain_log():
    found = read("# logger 7\n\nt,v,w\n0,20,1\n 1.5 ,21.25,2\n# pause\n3,-2e1,3\n")
    np.testing.assert_array_equal(found.t, [0, 1.5, 3])
    np.testing.assert_array_equal(found.v, [20, 21.25, -20])


@pytest.mark.parametrize(
    "text", ["t;v\n0;20,5\n1;21\n", "t\tv\n0\t20.5\n1\t21\n", 't,"v"\n0,"20.5"\n1,21\n', "t;v\n0;20.5\n1;21\n"]
)
def test_delimiters_and_decimal_comma(text):
    found = read(text)
    np.testing.assert_array_equal(found.v, [20.5, 21.0])


def test_time_unit():
    np.testing.assert_array_equal(read("t,v\n0,1\n1.5,2\n", Wanted("t", "v", "min")).t, [0, 90])
    np.testing.assert_array_equal(read("t,v\n0,1\n1.5,2\n", Wanted("t", "v", "h")).t, [0, 5400])
    (said,) = problems("t,v\n0,1\n1,2\n", Wanted("t", "v", "mm"))
    assert "time_unit" in said


@pytest.mark.parametrize(
    "stamps",
    [
        ("2024-05-01 06:30:00", "2024-05-01 06:31:00"),
        ("2024-05-01T06:30", "2024-05-01T06:31"),
        ("2024-03-31T00:59:30+00:00", "2024-03-31T03:00:30+02:00"),
        ("2024-05-01 06:30:00Z", "2024-05-01 06:31:00Z"),
    ],
)
def test_iso_time_stamps_count_from_the_first_row(stamps):
    a, b = stamps
    np.testing.assert_array_equal(read(f"t,v\n{a},1\n{b},2\n").t, [0, 60])


def test_utf8_mark_and_windows_text():
    np.testing.assert_array_equal(read("\ufefft,v\n0,1\n1,2\n".encode()).v, [1, 2])
    np.testing.assert_array_equal(read("t,T °C\n0,1\n1,2\n".encode("cp1252"), Wanted("t", "T °C", "s")).v, [1, 2])


def test_gap_is_refused_with_its_line():
    (said,) = problems("# head\nt,v\n0,1\n1,\n2,3\n")
    assert "kiln.csv, line 4" in said
    assert "gap" in said


def test_missing_cell_is_a_gap():
    (said,) = problems("t,v\n0,1\n1\n2,3\n")
    assert "line 3" in said


def test_no_number_is_refused_with_line_and_column():
    (said,) = problems("t,v\n0,1\n1,--\n2,3\n")
    assert 'line 3, column "v"' in said
    for bad in ("nan", "inf", "1_0", "1,5", "0x10"):
        cell = f'"{bad}"' if "," in bad else bad
        assert "line 3" in problems(f"t,v\n0,1\n1,{cell}\n2,3\n")[0]


def test_bad_time_is_refused_with_line_and_column():
    (said,) = problems("t,v\n0,1\nx,2\n2,3\n")
    assert 'line 3, column "t"' in said
    (said,) = problems("t,v\n2024-05-01,1\nlater,2\n2024-05-03,3\n")
    assert 'line 3, column "t"' in said
    (said,) = problems("t,v\n2024-05-01 00:00,1\n2024-05-02 00:00Z,2\n")
    assert "line 3" in said


def test_mixed_decimal_marks_are_refused():
    (said,) = problems("t;v\n0;1.500\n1;2,5\n")
    assert "both" in said


def test_times_that_go_back_are_refused_with_their_line():
    (said,) = problems("t,v\n0,1\n2,1\n1,2\n")
    assert "line 4" in said
    assert "sort" in said


def test_time_given_twice_is_refused_unless_jumps():
    text = "t,v\n0,1\n1,1\n1,2\n2,2\n"
    (said,) = problems(text)
    assert "line 4" in said
    assert "line 3" in said
    assert "jumps = true" in said
    np.testing.assert_array_equal(read(text, Wanted("t", "v", "s", jumps=True)).t, [0, 1, 1, 2])
    (said,) = problems("t,v\n0,1\n1,1\n1,2\n1,3\n2,2\n", Wanted("t", "v", "s", jumps=True))
    assert "line 5" in said


def test_max_gap():
    text = "t,v\n0,1\n1,1\n9,2\n"
    (said,) = problems(text, Wanted("t", "v", "s", max_gap=5.0))
    assert "line 4" in said
    assert "8 s" in said
    assert len(read(text, Wanted("t", "v", "s", max_gap=8.0)).t) == 3


def test_unknown_column_names_the_nearest():
    said = problems("minute,kiln\n0,1\n1,2\n", Wanted("minut", "kilm", "s"))
    assert '"minute"' in said[0]
    assert '"kiln"' in said[1]


def test_doubled_column_is_refused():
    (said,) = problems("t,v,v\n0,1,2\n1,2,3\n")
    assert "rename" in said


def test_other_doubled_columns_do_not_matter():
    assert len(read("t,v,x,x\n0,1,2,3\n1,2,3,4\n").t) == 2


@pytest.mark.parametrize(
    ("content", "says"),
    [
        (b"", "right file"),
        (b"# only\n", "right file"),
        (b"t\n0\n1\n", "names of the columns"),
        (b"t,v\n0,\x00\n", "zero bytes"),
        (b"t,v\n0,1\n", "two rows"),
        (b't,v\n0,"a\nb"\n1,2\n', "line break"),
        (b't,v\n0,"1" x\n1,2\n', "quotes"),
    ],
)
def test_what_is_no_log(content, says):
    assert any(says in said for said in problems(content))


def test_all_faults_at_once_up_to_a_bound():
    assert len(problems("t,v\n0,\n1,x\ny,2\n3,4\n")) == 3
    rows = "\n".join(f"{i},x" for i in range(500))
    assert len(problems(f"t,v\n{rows}\n")) == MAX_FAULTS


def test_too_many_rows(monkeypatch):
    monkeypatch.setattr(logs, "MAX_ROWS", 3)
    assert "at most 3 rows" in problems("t,v\n0,1\n1,2\n2,3\n")[0]


# --- where logs are found --------------------------------------------------------------------------


def test_folder(tmp_path):
    (tmp_path / "sub").mkdir()
    (tmp_path / "sub" / "a.csv").write_text("t,v\n0,1\n1,2\n")
    assert len(LogFolder(tmp_path).samples("sub/a.csv", PLAIN).t) == 2


@pytest.mark.parametrize(
    "name", ["../a.csv", "/etc/hosts", "sub/../../a.csv", "..\\a.csv", "C:\\a.csv", "C:a.csv", "."]
)
def test_paths_that_lead_out_are_refused(tmp_path, name):
    inside = tmp_path / "inside"
    (inside / "sub").mkdir(parents=True)
    (tmp_path / "a.csv").write_text("t,v\n0,1\n1,2\n")
    for place in (LogFolder(inside), LogFolder(members={"a.csv": b"", "../a.csv": b""})):
        with pytest.raises(DocketError) as caught:
            place.read(name)
        assert "inside it" in str(caught.value)


def test_missing_log_names_the_nearest(tmp_path):
    (tmp_path / "kiln.csv").write_text("t,v\n")
    with pytest.raises(DocketError) as caught:
        LogFolder(tmp_path).read("kilm.csv")
    assert '"kiln.csv"' in str(caught.value)
    with pytest.raises(DocketError) as caught:
        LogFolder(members={"kiln.csv": b""}).read("kilm.csv")
    assert '"kiln.csv"' in str(caught.value)


def test_log_that_is_too_large(tmp_path, monkeypatch):
    (tmp_path / "a.csv").write_text("t,v\n0,1\n1,2\n")
    monkeypatch.setattr(log_folder, "MAX_BYTES", 5)
    with pytest.raises(DocketError) as caught:
        LogFolder(tmp_path).read("a.csv")
    assert "at most 5 bytes" in str(caught.value)


@given(
    st.lists(st.tuples(st.floats(0.01, 100), st.floats(-1e3, 1e3)), min_size=2, max_size=30), st.sampled_from(",;\t")
)
def test_written_log_reads_back(rows, mark):
    t = np.cumsum([dt for dt, _ in rows])
    v = [value for _, value in rows]
    text = f"t{mark}v\n" + "".join(f"{a!r}{mark}{b!r}\n" for a, b in zip(t.tolist(), v, strict=True))
    found = read(text)
    np.testing.assert_array_equal(found.t, t)
    np.testing.assert_array_equal(found.v, v)
