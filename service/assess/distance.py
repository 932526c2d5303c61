"""Distances by bracketing, for arrays of problems at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

__all__ = ["falling_root"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: Relative width at which a bracket counts as closed.
CLOSED = 4e-15
STEPS = 200


def falling_root(excess: Callable[[Ints, Floats], Floats], low: Floats, high: Floats) -> Floats:
    """Where each falling function passes through zero.

    Parameters
    ----------
    excess : called with indices (m,) and places (m,), returns the values (m,) there; not negative at
        `low`, not positive at `high`, falling in between
    low, high : (n,) brackets; an infinite `high` is found by doubling

    Returns
    -------
    (n,) roots; infinite where the function never falls below zero.

    Method: inverse quadratic interpolation guarded by bisection (Chandrupatla, Advances in
    Engineering Software 28(3):145-149, 1997, from memory). A closed bracket needs no evaluation.
    """
    low, high = low.copy(), high.copy()
    _close_open_ends(excess, low, high)
    root = high.copy()
    with np.errstate(invalid="ignore"):
        todo = np.flatnonzero(np.isfinite(high) & (high - low > CLOSED * high))
    if not todo.size:
        return root
    b, a = low[todo], high[todo]
    fb, fa = excess(todo, b), excess(todo, a)
    # Rounding can leave an end on the wrong side by a hair: that end is then the root.
    for end, wrong in ((b, fb <= 0.0), (a, fa >= 0.0)):
        root[todo[wrong]] = end[wrong]
    keep = (fb > 0.0) & (fa < 0.0)
    todo = todo[keep]
    a, b, fa, fb = a[keep], b[keep], fa[keep], fb[keep]
    c, fc, t = a, fa, np.full(a.shape, 0.5)
    for _ in range(STEPS):
        if not todo.size:
            break
        x = a + t * (b - a)
        fx = excess(todo, x)
        same = np.sign(fx) == np.sign(fa)
        c, fc = np.where(same, a, b), np.where(same, fa, fb)
        b, fb = np.where(same, b, a), np.where(same, fb, fa)
        a, fa = x, fx
        best = np.where(np.abs(fa) < np.abs(fb), a, b)
        root[todo] = best
        width = np.abs(b - a)
        tolerance = CLOSED * np.abs(best)
        keep = (width > tolerance) & (fa != 0.0)
        todo = todo[keep]
        a, b, c, fa, fb, fc, tolerance = (y[keep] for y in (a, b, c, fa, fb, fc, tolerance))
        t = _next_step(a, b, c, fa, fb, fc)
        limit = np.minimum(0.5, 0.5 * tolerance / np.abs(b - a)) if todo.size else tolerance
        t = np.clip(t, limit, 1.0 - limit)
    return root


def _next_step(a: Floats, b: Floats, c: Floats, fa: Floats, fb: Floats, fc: Floats) -> Floats:
    """Fraction of the way from a to b: interpolation where it is safe, else one half."""
    with np.errstate(divide="ignore", invalid="ignore"):
        xi = (a - b) / (c - b)
        phi = (fa - fb) / (fc - fb)
        safe = (phi**2 < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
        t = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
    return np.where(safe & np.isfinite(t), t, 0.5)


def _close_open_ends(excess: Callable[[Ints, Floats], Floats], low: Floats, high: Floats) -> None:
    """Replace infinite upper ends by doubling, in place; left infinite where nothing is found."""
    todo = np.flatnonzero(np.isinf(high) & np.isfinite(low))
    reach = np.maximum(low[todo], 1.0)
    for _ in range(400):
        if not todo.size:
            return
        reach = reach * 2.0
        value = excess(todo, reach)
        done = value <= 0.0
        high[todo[done]] = reach[done]
        low[todo[~done]] = reach[~done]
        todo, reach = todo[~done], reach[~done]
