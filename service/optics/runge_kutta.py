"""Runge-Kutta integration of many small systems at once, each with its own step."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Trace", "integrate"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

SAFETY, SHRINK, GROW = 0.9, 0.2, 4.0


@dataclass(slots=True)
class Trace:
    """What an integration found.

    `time_s` (n,) the end reached; `state` (s, n) there; `peak` (s, n) the largest value of each state
    at any step; `times` (m,) and `states` (s, 1, m) every accepted step of a single system where it was
    asked for, else empty.
    """

    time_s: Floats
    state: Floats
    peak: Floats
    times: Floats
    states: Floats


def integrate(
    change: Callable[[Floats, Floats, Ints], Floats],
    start: Floats,
    until_s: Floats,
    *,
    tolerance: float,
    steps: int,
    record: bool = False,
) -> Trace:
    """Integrate every system from time 0 to its end with steps of its own.

    Parameters
    ----------
    change : called with times (m,), states (s, m) and the numbers (m,) of the systems, returns (s, m)
    start : (s, n) states at time 0
    until_s : (n,) end of each system [s]
    tolerance : largest error of one step, in the units of the states
    steps : most steps altogether
    record : keep the steps of the first system

    Method: embedded pair of order 3(2) with the first stage reused (Bogacki and Shampine, Applied
    Mathematics Letters 2(4):321-325, 1989, from memory).
    """
    count = start.shape[1]
    time, state, peak = np.zeros(count), start.copy(), start.copy()
    todo = np.flatnonzero(until_s > 0.0)
    slope = change(time[todo], state[:, todo], todo)
    step = np.minimum(until_s[todo], 0.01 / np.maximum(np.abs(slope).max(axis=0), 1e-30))
    times, states = [time[:1].copy()], [state[:, :1].copy()]
    for _ in range(steps):
        if not todo.size:
            break
        t, y = time[todo], state[:, todo]
        h = np.minimum(step, until_s[todo] - t)
        k1 = slope
        k2 = change(t + 0.5 * h, y + 0.5 * h * k1, todo)
        k3 = change(t + 0.75 * h, y + 0.75 * h * k2, todo)
        new = y + h * (2.0 / 9.0 * k1 + 1.0 / 3.0 * k2 + 4.0 / 9.0 * k3)
        k4 = change(t + h, new, todo)
        wrong = h * np.abs(-5.0 / 72.0 * k1 + k2 / 12.0 + k3 / 9.0 - 0.125 * k4)
        error = (wrong / (tolerance * (1.0 + np.abs(new)))).max(axis=0)
        error = np.where(np.isfinite(error), error, np.inf)
        good = error <= 1.0
        number = todo[good]
        time[number] = t[good] + h[good]
        state[:, number] = new[:, good]
        peak[:, number] = np.maximum(peak[:, number], new[:, good])
        slope = np.where(good, k4, k1)
        with np.errstate(divide="ignore"):
            step = h * np.clip(SAFETY * error ** (-1.0 / 3.0), SHRINK, GROW)
        if record and number.size and number[0] == 0:
            times.append(time[:1].copy())
            states.append(state[:, :1].copy())
        going = time[todo] < until_s[todo] * (1.0 - 1e-12)
        if not going.all():
            todo, slope, step = todo[going], slope[:, going], step[going]
    kept = np.concatenate(times) if record else np.empty(0)
    path = np.stack(states, axis=-1) if record else np.empty((start.shape[0], 1, 0))
    return Trace(time, state, peak, kept, path)
