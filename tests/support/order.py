"""Orders of convergence: what was observed, and whether theory's was reached."""

import numpy as np

BELOW, ABOVE = 0.15, 0.35
"""The window around theory's order. An order outside it means that the levels are not asymptotic: use finer ones, never a wider window."""


def observed_orders(errors):
    """Return log2 of the ratios of errors of runs whose sizes halve, (n - 1,)."""
    errors = np.asarray(errors, dtype=float)
    return np.log2(errors[:-1] / errors[1:])


def assert_order(errors, order, cap):
    """Fail unless the last two of at least four levels show theory's order and the last error is below the cap.

    A cap is an error that theory's leading term gives within a small factor, so that an order reached with a wrong constant fails too.
    """
    assert len(errors) >= 4, "an order needs four levels"
    seen = observed_orders(errors)
    assert order - BELOW <= seen[-1] <= order + ABOVE, (
        f"order {seen[-1]:.3f}, theory {order:.3f}; errors {errors}, orders {seen}"
    )
    assert errors[-1] <= cap, f"error {errors[-1]:.3g} above {cap:.3g}"
