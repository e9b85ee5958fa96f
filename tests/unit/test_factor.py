"""Factors of the step matrices, with CHOLMOD and without."""

import numpy as np
import pytest
import scipy.sparse as sp
from scipy.sparse.linalg import spsolve

import fem.solve.factor
from fem.results.history import Key
from fem.solve.conduction import Conduction
from fem.solve.factor import KEPT, FactorFailed, Factorizer
from fem.vouch import look
from tests.support.cases import slab_docket
from tests.support.grids import problem_on, square
from tests.support.jobs import Job, bar, posed, solved


@pytest.fixture
def backend(request, monkeypatch):
    if request.param and not fem.solve.factor.CHOLMOD:
        pytest.fail("cvxopt is a dependency: CHOLMOD must be there")
    monkeypatch.setattr(fem.solve.factor, "CHOLMOD", request.param)


def matrix(cells=6, shift=1.0):
    """Return a conduction matrix with some storage, and its lower triangle by columns."""
    mesh = square(cells)
    c = Conduction(mesh, problem_on(mesh.plan))
    full = (c.stiffness(0.0, c.start()) + shift * sp.eye_array(c.n)).tocsc()
    lower = sp.csc_array(sp.tril(full))
    lower.sort_indices()
    return full, lower


@pytest.mark.parametrize("backend", [True, False], indirect=True, ids=["CHOLMOD", "SuperLU"])
@pytest.mark.parametrize("cells", [6, 110])
def test_solves_agree_with_a_general_solver(backend, cells):
    """110 x 110 cells are beyond the size at which CHOLMOD is asked for blocked factors."""
    full, lower = matrix(cells)
    b = np.cos(np.arange(full.shape[0]))
    x = Factorizer(lower.indptr, lower.indices).factor(lower.data).solve(b)
    assert x == pytest.approx(spsolve(full, b), rel=1e-9, abs=1e-12)
    assert b == pytest.approx(np.cos(np.arange(full.shape[0])))  # the right side is left alone


@pytest.mark.parametrize("backend", [True, False], indirect=True, ids=["CHOLMOD", "SuperLU"])
def test_kept_factors_stay_right_while_others_come_and_go(backend):
    full, lower = matrix()
    worker, b = Factorizer(lower.indptr, lower.indices), np.ones(full.shape[0])
    diagonal = lower.indptr[:-1]
    first = worker.factor(lower.data, key=0)
    for key in range(1, KEPT + 3):
        data = lower.data.copy()
        data[diagonal] += key
        worker.factor(data, key=key)
    assert worker.recall(0) is None  # the oldest had to go
    for key in range(3, KEPT + 3):
        kept = worker.recall(key)
        assert kept is not None
        assert kept.solve(b) == pytest.approx(spsolve((full + key * sp.eye_array(full.shape[0])).tocsc(), b), rel=1e-9)
    worker.forget()
    assert worker.recall(KEPT + 2) is None
    assert worker.count == KEPT + 3
    del first


def test_the_factor_that_was_used_last_stays_longest():
    _, lower = matrix()
    worker = Factorizer(lower.indptr, lower.indices)
    for key in range(KEPT):
        worker.factor(lower.data, key=key)
    worker.recall(0)
    worker.factor(lower.data, key=KEPT)
    assert worker.recall(0) is not None
    assert worker.recall(1) is None


@pytest.mark.parametrize("backend", [True, False], indirect=True, ids=["CHOLMOD", "SuperLU"])
@pytest.mark.parametrize("fault", ["nan", "zero"])
def test_what_can_not_be_factored_is_said(backend, fault):
    _, lower = matrix()
    data = lower.data * 0.0 if fault == "zero" else np.where(lower.data > 1.0, np.nan, lower.data)
    with pytest.raises(FactorFailed):
        Factorizer(lower.indptr, lower.indices).factor(data)


def test_a_run_gives_the_same_answer_without_cholmod(monkeypatch):
    for curved in (False, True):
        mesh, job = bar(), Job(curved=curved)
        with_it = solved(mesh, posed(job, mesh.plan)).frames
        monkeypatch.setattr(fem.solve.factor, "CHOLMOD", False)
        without = solved(mesh, posed(job, mesh.plan)).frames
        monkeypatch.setattr(fem.solve.factor, "CHOLMOD", True)
        np.testing.assert_allclose(without, with_it, rtol=1e-9)


def test_a_whole_look_gives_the_same_answer_without_cholmod(monkeypatch):
    first = look(slab_docket()).figures.series(Key("gauge", "back"))[0]
    monkeypatch.setattr(fem.solve.factor, "CHOLMOD", False)
    np.testing.assert_allclose(look(slab_docket()).figures.series(Key("gauge", "back"))[0], first, rtol=1e-9)
