"""Errors say where, what, what is allowed and how to mend it."""

import pickle

import pytest

from fem.errors import (
    LONGEST_VALUE,
    DocketError,
    HeatvouchError,
    MeshError,
    Problem,
    Said,
    SectionError,
    StoreError,
    SystemLibraryMissing,
    refusal,
    shown,
)


def test_problem_says_everything():
    problem = Problem(
        'region "deck", edge 3', '"7,5"', "a length", "write a decimal point", "kiln.docket.toml", (0.5, 0.06)
    )
    text = str(problem)
    for part in (
        "kiln.docket.toml",
        'region "deck", edge 3',
        '"7,5"',
        "a length",
        "write a decimal point",
        "x = 0.5 m",
        "0.06",
    ):
        assert part in text
    assert "\n" not in text


def test_problem_without_value_file_or_spot_leaves_no_gaps():
    text = str(Problem("clock", "", "end", "add end"))
    assert text == "clock: Allowed: end. To mend: add end."


def test_question_keeps_its_mark():
    assert str(Problem("a", "b", "c", 'did you mean "d"?')).endswith('"d"?')


def test_docket_error_lists_all():
    problems = [Problem("a", "1", "x", "y"), Problem("b", "2", "x", "y")]
    error = DocketError(problems)
    assert error.problems == tuple(problems)
    assert str(error) == f"{problems[0]}\n{problems[1]}"
    assert all(p.file == "f" for p in error.in_file("f").problems)


def test_docket_error_needs_a_problem():
    with pytest.raises(TypeError):
        DocketError([])


@pytest.mark.parametrize("kind", [DocketError, SectionError, MeshError, StoreError, SystemLibraryMissing])
def test_one_root(kind):
    assert issubclass(kind, HeatvouchError)


def test_section_error_has_its_spot():
    error = SectionError.single("region", "", "a", "b", xy=(1.0, 2.0))
    assert isinstance(error, SectionError)
    assert error.xy == (1.0, 2.0)
    assert SectionError.single("region", "", "a", "b").xy is None


@pytest.mark.parametrize(
    "error", [SectionError.single("a", "b", "c", "d", file="f", xy=(1.0, 2.0)), SystemLibraryMissing("libGLU.so.1")]
)
def test_errors_cross_processes_whole(error):
    back = pickle.loads(pickle.dumps(error))
    assert type(back) is type(error)
    assert str(back) == str(error)


def test_missing_system_library_is_one_line_that_names_the_packages():
    text = str(SystemLibraryMissing("libGLU.so.1"))
    assert "\n" not in text
    assert "libGLU.so.1" in text
    for package in ("libgl1", "libglu1-mesa", "libxrender1", "libxcursor1", "libxft2", "libxinerama1", "libgomp1"):
        assert package in text.split()


def test_shown_is_short_and_on_one_line():
    assert shown("a\nb") == '"a b"'
    assert shown(Said("a gap")) == "a gap"
    assert shown([1, 2]) == "[1, 2]"
    assert len(shown("x" * 500)) == LONGEST_VALUE


def test_refusal_carries_what_is_allowed():
    error = refusal("a {number}", "write one")
    assert error.context == {"allowed": "a {number}", "hint": "write one"}
