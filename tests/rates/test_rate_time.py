"""Orders in time of the five-stage method, against solvers that share no code with it.

Hairer and Wanner, Solving Ordinary Differential Equations II, 2nd ed. 1996, table IV.6.5: order 4 where the data are smooth and the steps
follow the fastest process; stage order 1, so at least 2 where held values move fast against the mesh (sec. IV.15; Ostermann and Roche,
Math. Comp. 59, 1992). The mesh is fixed: what is compared is the same system of ordinary differential equations.
"""

import numpy as np
from scipy.integrate import solve_ivp
from scipy.linalg import expm

import fem.solve.stepping
from fem.laws import Break, Law
from fem.solve.conduction import Conduction
from fem.solve.march import Outcome
from fem.solve.run import run
from fem.solve.stepping import Steps
from tests.support.cases import gauges_at
from tests.support.grids import face, problem_on, strip
from tests.support.order import assert_order, observed_orders

NONE = gauges_at()
COUNTS = (8, 16, 32, 64)


def march_errors(mesh, problem, reference, counts=COUNTS, breaks=(), tolerance=1e-5):
    """Return the largest nodal error at the end for equal steps, which land on the breaks where any are given."""
    errors = []
    for n in counts:
        steps = Steps(np.linspace(problem.begin, problem.end, n + 1), {b.t: b.jump for b in breaks})
        errors.append(np.abs(field_at_end(mesh, problem, steps=steps, tolerance=tolerance) - reference).max())
    return errors


def field_at_end(mesh, problem, *, tolerance=1e-5, **how):
    """Return the temperatures at the end of a march."""
    result = run(mesh, problem, NONE, tolerance=tolerance, frame_times=np.array([problem.end]), **how)
    assert result.outcome is Outcome.finished
    return result.frames[0]


def integrate(mesh, problem, span=None, start=None):
    """Return the nodes' temperatures after a span by scipy's explicit method of order 8 at its tightest tolerance."""
    c = Conduction(mesh, problem)
    T0 = c.start() if start is None else start
    t0, t1 = (problem.begin, problem.end) if span is None else span

    def rate(t, free):
        T = T0.copy()
        T[c.free], T[c.held] = free, c.held_values(t)
        return ((c.loads(t, T).into - c.stiffness(t, T) @ T) / c.capacity(T))[c.free]

    solved = solve_ivp(rate, (t0, t1), T0[c.free], method="DOP853", rtol=2.3e-13, atol=1e-12)
    assert solved.success
    T = T0.copy()
    T[c.free], T[c.held] = solved.y[:, -1], c.held_values(t1 - 1e-12)
    return T


def test_a_smooth_decay_is_of_order_four():
    mesh = strip(cells=8)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, 0.0))], start=lambda x, y: 1 + x**2, end=0.1
    )
    c = Conduction(mesh, problem)
    matrix = c.stiffness(0.0, c.start()).toarray() + np.diag(c.loads(0.0, c.start()).slope)
    exact = expm(-0.1 * matrix / c.capacity(c.start())[:, None]) @ c.start()
    # The fastest mode decays by 4/h^2 = 256, twice that in corners: 64 steps of 1/640 have z below one, and leave less than
    # z^5 / 120 each of what it holds.
    assert_order(march_errors(mesh, problem, exact), 4.0, cap=1e-5)


def test_k_c_and_radiation_over_temperature_are_of_order_four():
    mesh = strip(cells=6)
    film = face(mesh.plan, "part 0.right", radiant=(0.8, 900.0), film=(lambda T: 5.0 + 0.01 * T, 800.0))
    problem = problem_on(
        mesh.plan,
        [film],
        k=lambda T: 20.0 + 0.02 * T,
        rho_c=lambda T: 4e3 + 2.0 * T,
        start=lambda x, y: 300.0 + 50.0 * x,
        end=20.0,
    )
    reference = integrate(mesh, problem)
    assert_order(march_errors(mesh, problem, reference, (16, 32, 64, 128)), 4.0, cap=1e-3)


def smooth(t):
    return 1.0 + np.sin(3.0 * t)


def test_a_smooth_ambient_is_of_order_four():
    mesh = strip(cells=2)
    film = face(mesh.plan, "part 0.right", film=(lambda t: 2.0 + np.cos(2.0 * t), smooth))
    problem = problem_on(mesh.plan, [film], start=0.0, end=1.0)
    # Newton's remainder, 1e-6 of the tolerance in each of 640 stages, must stay below the last error.
    errors = march_errors(mesh, problem, integrate(mesh, problem), (16, 32, 64, 128), tolerance=1e-7)
    assert_order(errors, 4.0, cap=1e-6)


def test_a_held_edge_that_moves_is_of_order_two_at_least():
    mesh = strip(cells=64)  # stiff: one step is hundreds of times h^2 / alpha
    problem = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", held=smooth)], start=1.0, end=1.0)
    reference = field_at_end(mesh, problem, steps=Steps(np.linspace(0, 1, 2049)))
    errors = march_errors(mesh, problem, reference)
    assert observed_orders(errors)[-1] >= 2.0 - 0.15, errors
    assert errors[-1] <= (3.0 / 64) ** 2, errors  # (omega dt)^2 with a constant of one


def test_a_held_edge_that_moves_slowly_against_the_mesh_is_of_order_four():
    mesh = strip(cells=3)
    problem = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", held=smooth)], start=1.0, end=1.0)
    assert_order(march_errors(mesh, problem, integrate(mesh, problem), (16, 32, 64, 128)), 4.0, cap=1e-6)


JUMP = 0.5


def jumping():
    """Return an ambient that jumps at 0.5 and a problem with it."""
    law = Law(lambda t: np.where(t < JUMP, 1.0, 3.0), frozenset({"t"}), (Break(JUMP, jump=True),))
    mesh = strip(cells=4)
    return mesh, problem_on(mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, law))], start=0.0, end=1.0)


def jump_reference(mesh, problem):
    before = Law(lambda: 1.0)
    first = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, before))], start=0.0, end=1.0)
    second = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, 3.0))], start=0.0, end=1.0)
    middle = integrate(mesh, first, (0.0, JUMP))
    return integrate(mesh, second, (JUMP, 1.0), middle)


def test_landing_on_a_jump_keeps_order_four():
    mesh, problem = jumping()
    errors = march_errors(mesh, problem, jump_reference(mesh, problem), (16, 32, 64, 128), problem.breaks())
    assert_order(errors, 4.0, cap=1e-6)


def test_reading_the_value_after_a_jump_too_early_drops_the_order_to_one(monkeypatch):
    """Teeth of the test above: the last stage before the jump must not see the value after it."""
    monkeypatch.setattr(fem.solve.stepping, "INSIDE", 0.0)
    mesh, problem = jumping()
    errors = march_errors(mesh, problem, jump_reference(mesh, problem), (16, 32, 64, 128), problem.breaks())
    assert observed_orders(errors)[-1] < 1.5, errors


def test_stepping_over_a_jump_loses_the_order():
    mesh, problem = jumping()
    errors = march_errors(mesh, problem, jump_reference(mesh, problem), (17, 35, 71, 143))
    assert observed_orders(errors)[-1] < 2.5, errors


def test_heat_through_a_face_is_of_order_four():
    mesh = strip(cells=4)
    problem = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, smooth))], start=0.0, end=1.0)
    c = Conduction(mesh, problem)
    stored = float(c.heat(integrate(mesh, problem)).sum() - c.heat(c.start()).sum())  # all that came in is stored
    errors = []
    for n in (16, 32, 64, 128):
        result = run(mesh, problem, NONE, tolerance=1e-5, steps=Steps(np.linspace(0, 1, n + 1)))
        errors.append(abs(result.face_heat[0] - stored))
    assert_order(errors, 4.0, cap=1e-6 * stored)


def test_chosen_steps_keep_the_error_below_the_sum_of_their_tolerances():
    """The exact flow does not spread errors (maximum principle), so what n steps leave is at most n times what one may leave."""
    mesh = strip(cells=16)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(5.0, lambda t: 100.0 * smooth(t)))], start=0.0, end=1.0
    )
    reference = integrate(mesh, problem)
    for tolerance in (1e-2, 1e-3, 1e-4):
        result = run(mesh, problem, NONE, tolerance=tolerance, first=1e-3, frame_times=np.array([1.0]))
        assert np.abs(result.frames[0] - reference).max() <= len(result.steps) * tolerance
