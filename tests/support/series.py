"""Exact solutions of the heat equation. Sources are named at each; all were written out anew from the separated solution."""

import numpy as np
from scipy.optimize import brentq
from scipy.special import erfc, j0, j1, jn_zeros

TERMS = 200


def slab_held(x, t, *, half, alpha, start, held):
    """Return T in |x| <= half, uniform at the start, both surfaces held from t = 0 on.

    Carslaw and Jaeger, Conduction of Heat in Solids, 2nd ed. 1959, ch. III (region -l < x < l, constant surface temperature).
    """
    n = np.arange(TERMS)
    beta = (2 * n + 1) * np.pi / (2 * half)
    terms = 4 / np.pi * (-1.0) ** n / (2 * n + 1) * np.exp(-alpha * beta**2 * t) * np.cos(beta * x)
    return held + (start - held) * float(terms.sum())


def film_roots(biot, count=60):
    """Return the roots of beta tan(beta) = Bi, one in each (n pi, n pi + pi/2)."""
    eps = 1e-12
    return np.array(
        [
            brentq(lambda b: b * np.sin(b) - biot * np.cos(b), n * np.pi + eps, n * np.pi + np.pi / 2 - eps)
            for n in range(count)
        ]
    )


def slab_film(x, t, *, half, k, alpha, h, start, ambient):
    """Return T in 0 <= x <= half, insulated at 0, film at x = half.

    Incropera and DeWitt, Fundamentals of Heat and Mass Transfer, sec. 5.5 (plane wall with convection); Carslaw and Jaeger, ch. III.
    """
    z = film_roots(h * half / k)
    c = 4 * np.sin(z) / (2 * z + np.sin(2 * z))
    return ambient + (start - ambient) * float((c * np.exp(-(z**2) * alpha * t / half**2) * np.cos(z * x / half)).sum())


def slab_flux(x, t, *, thick, k, alpha, flux, start):
    """Return T in 0 <= x <= thick, insulated at 0, constant heat flux into x = thick.

    Carslaw and Jaeger, ch. III (slab with constant flux at one surface, no flow over the other).
    """
    n = np.arange(1, TERMS)
    terms = (-1.0) ** n / n**2 * np.exp(-alpha * (n * np.pi / thick) ** 2 * t) * np.cos(n * np.pi * x / thick)
    rest = (3 * x**2 - thick**2) / (6 * thick**2) - 2 / np.pi**2 * float(terms.sum())
    return start + flux * t / (k / alpha * thick) + flux * thick / k * rest


def cylinder_held(r, t, *, radius, alpha, start, held):
    """Return T in a long cylinder, uniform at the start, surface held. Carslaw and Jaeger, ch. VII."""
    z = jn_zeros(0, 60)
    return held + (start - held) * float(
        (2 / (z * j1(z)) * np.exp(-alpha * (z / radius) ** 2 * t) * j0(z * r / radius)).sum()
    )


def sphere_held(r, t, *, radius, alpha, start, held):
    """Return T in a sphere, uniform at the start, surface held. Carslaw and Jaeger, ch. IX."""
    n = np.arange(1, TERMS)
    decay = np.exp(-alpha * (n * np.pi / radius) ** 2 * t)
    shape = np.ones_like(decay) if r == 0 else radius / (n * np.pi * r) * np.sin(n * np.pi * r / radius)
    return held + (start - held) * float((-2 * (-1.0) ** n * decay * shape).sum())


def two_bodies(x, t, *, k, rho_c, start):
    """Return T of two half spaces that touch at x = 0 from t = 0 on; pairs are (x < 0, x > 0).

    Carslaw and Jaeger, ch. II (infinite composite solid): the joint stays at the mean weighted by sqrt(k rho c).
    """
    e = [np.sqrt(k[i] * rho_c[i]) for i in (0, 1)]
    joint = (e[0] * start[0] + e[1] * start[1]) / (e[0] + e[1])
    i = int(x > 0)
    return start[i] + (joint - start[i]) * float(erfc(abs(x) / (2 * np.sqrt(k[i] / rho_c[i] * t))))


def half_space_flux(x, t, *, k, alpha, flux, start):
    """Return T at depth x of a half space with constant flux into it. Carslaw and Jaeger, ch. II."""
    s = np.sqrt(alpha * t)
    return start + flux / k * (2 * s / np.sqrt(np.pi) * np.exp(-(x**2) / (4 * s**2)) - x * float(erfc(x / (2 * s))))


def two_layer_mode(k, rho_c, lengths):
    """Return the slowest decay rate [1/s] and the mode phi(x) of two layers in series, both outer surfaces held at zero.

    Ozisik, Heat Conduction, 2nd ed. 1993, ch. 8 (composite media): temperature and flux are continuous at the joint.
    """
    a, b = lengths

    def wave(rate):
        return [np.sqrt(rate * rho_c[i] / k[i]) for i in (0, 1)]

    def mismatch(rate):
        p, q = wave(rate)
        return k[0] * p * np.cos(p * a) * np.sin(q * b) + k[1] * q * np.cos(q * b) * np.sin(p * a)

    top = min((np.pi / a) ** 2 * k[0] / rho_c[0], (np.pi / b) ** 2 * k[1] / rho_c[1])
    rates = np.linspace(1e-6 * top, top, 2000)
    values = np.array([mismatch(r) for r in rates])
    first = int(np.flatnonzero(values[:-1] * values[1:] < 0)[0])
    rate = brentq(mismatch, rates[first], rates[first + 1], xtol=1e-14)
    p, q = wave(rate)
    right = np.sin(p * a) / np.sin(q * b)

    def phi(x):
        return np.where(x <= a, np.sin(p * np.minimum(x, a)), right * np.sin(q * (a + b - np.maximum(x, a))))

    return rate, phi
