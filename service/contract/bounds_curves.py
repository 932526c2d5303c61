"""Solutions of the rate equations for one laser, as curves to plot."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.contract.bounds_result import Curve
from service.optics.gain_bounds import Pumps
from service.optics.rate_equations import Resonators, follow, steady_state
from service.optics.runge_kutta import Trace

__all__ = ["POINTS", "opened", "stored_ions", "switched_on"]

Floats = NDArray[np.float64]

#: Most points of a curve, two for each bucket of steps.
POINTS = 600
STEPS = 5000
TOLERANCE = 1e-4
#: Relaxation oscillations shown after threshold.
SPIKES = 14.0


def stored_ions(laser: Resonators, pump: Pumps) -> Floats:
    """Ions in the upper level after a long dark pump, or at the end of a pump pulse [ions].

    X(t) = R tau' (1 - exp(-t / tau')) with 1 / tau' = 1 / tau + R / X_t.
    """
    rate = 1.0 / laser.lifetime_s + pump.photons_per_s / laser.ions
    return pump.photons_per_s / rate * -np.expm1(-pump.pulse_s * rate)


def switched_on(laser: Resonators, pump: Pumps) -> Curve:
    """The pump comes on at time 0: populations and light until the spiking has settled."""
    one = np.ones(1)
    dark = float(steady_state(laser, pump.photons_per_s).dark_upper[0])
    clamped = float(laser.upper_at(laser.threshold_inversion)[0])
    tau = float(laser.lifetime_s[0])
    until = 5.0 * tau
    if dark > clamped:
        rise = 1.0 / (1.0 / tau + float(pump.photons_per_s[0] / laser.ions[0]))
        above = dark / clamped - 1.0
        oscillation = 2.0 * np.pi * np.sqrt(tau * float(laser.photon_lifetime_s[0]) / above)
        until = -rise * np.log1p(-clamped / dark) + SPIKES * oscillation
    if np.isfinite(pump.pulse_s[0]):
        until = min(until, float(pump.pulse_s[0]) * 1.25)
    trace = follow(
        laser,
        pump.photons_per_s,
        0.0 * one,
        one,
        until * one,
        pump_s=pump.pulse_s,
        record=True,
        steps=STEPS,
        tolerance=TOLERANCE,
    )
    return _curve(laser, trace, 0.0, until)


def opened(laser: Resonators, pump: Pumps) -> tuple[Curve, dict[str, float]] | None:
    """The resonator opens at time 0 with all that the pump can store; None below threshold.

    Returns the curve around the pulse, and its energy [J] through the output mirror, peak power [W], full
    width at half maximum and build-up time [s].
    """
    upper = stored_ions(laser, pump)
    above = float((laser.inversion(upper) / laser.threshold_inversion)[0])
    if above <= 1.0 + 1e-6:
        return None
    tau_c = float(laser.photon_lifetime_s[0])
    build_up = tau_c * np.log(max(float(upper[0]), 10.0)) / (above - 1.0)
    until = min(1.2 * build_up + 20.0 * tau_c * (1.0 + 2.0 / (above - 1.0)), float(laser.lifetime_s[0]) * 5.0)
    trace = follow(
        laser,
        pump.photons_per_s,
        upper,
        np.ones(1),
        np.array([until]),
        record=True,
        steps=STEPS,
        tolerance=TOLERANCE * 1e-1,
    )
    light = trace.states[1, 0]
    top = int(light.argmax())
    half = light >= 0.5 * light[top]
    first, last = _edges(half, top)
    width = float(_cross(trace.times, light, last, 1) - _cross(trace.times, light, first, -1))
    scale = float((laser.output_share * laser.photon_j)[0])
    peak_s = float(trace.times[top])
    end = int(np.searchsorted(trace.times, peak_s + 6.0 * width))
    found = {
        "energy_j": float(trace.states[2, 0, min(end, len(light) - 1)]) * scale,
        "peak_w": float(light[top]) / tau_c * scale,
        "width_s": width,
        "build_up_s": peak_s,
    }
    return _curve(laser, trace, max(0.0, peak_s - 4.0 * width), peak_s + 6.0 * width), found


def _edges(half: NDArray[np.bool_], top: int) -> tuple[int, int]:
    """First and last step of the run of steps above one half around the top."""
    outside = np.flatnonzero(~half)
    before, after = outside[outside < top], outside[outside > top]
    return (int(before[-1]) + 1 if before.size else 0), (int(after[0]) - 1 if after.size else len(half) - 1)


def _cross(times: Floats, light: Floats, k: int, side: int) -> float:
    """Time at which the light passes one half of its peak between step k and its neighbour."""
    other = k + side
    if not 0 <= other < len(times):
        return float(times[k])
    logs = np.log(light[[k, other]] / light.max()) - np.log(0.5)
    return float(times[k] + (times[other] - times[k]) * logs[0] / (logs[0] - logs[1]))


def _curve(laser: Resonators, trace: Trace, low: float, high: float) -> Curve:
    """The steps between two times, thinned so that every peak stays."""
    inside = np.flatnonzero((trace.times >= low) & (trace.times <= high))
    if len(inside) > POINTS:
        buckets = np.array_split(inside, POINTS // 2)
        light = trace.states[1, 0]
        picked = {int(b[light[b].argmax()]) for b in buckets} | {int(b[light[b].argmin()]) for b in buckets}
        inside = np.array(sorted(picked))
    upper, light = trace.states[0, 0, inside], trace.states[1, 0, inside]
    return Curve(
        time_s=trace.times[inside].tolist(),
        upper_ions=upper.tolist(),
        inversion=(laser.inversion(upper) / laser.threshold_inversion).tolist(),
        output_w=(light / laser.photon_lifetime_s * laser.photon_j * laser.output_share).tolist(),
    )
