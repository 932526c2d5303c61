"""Rate equations against closed forms that were derived by hand, not by this program."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from service.optics.rate_equations import LIGHT_M_S, PLANCK_J_S, Resonators, follow, steady_state
from tests.bounds.lasers import resonator


def settled(laser: Resonators, pump: float) -> tuple[float, float]:
    """Ions and photons after long integration under a constant pump."""
    until = 40.0 * laser.lifetime_s
    trace = follow(laser, np.array([pump]), np.zeros(1), np.ones(1), until, steps=60_000)
    assert trace.time_s[0] >= until[0] * 0.999
    return float(trace.state[0, 0]), float(trace.state[1, 0])


@pytest.mark.parametrize(("ions", "ratio"), [(np.inf, 0.0), (1.5e16, 0.0), (2e16, 0.05), (3e16, 1.0)])
@pytest.mark.parametrize("times", [0.5, 1.5, 4.0])
def test_steady_state_is_where_the_integration_settles(ions: float, ratio: float, times: float) -> None:
    """A large loss keeps photon and upper-level lifetimes near each other, so that it settles fast."""
    laser = resonator(ions=ions, lower_ratio=ratio, lifetime_s=2e-7, output_reflectance=0.6, length_m=1.0)
    clamped = float(laser.upper_at(laser.threshold_inversion)[0])
    share = clamped / ions
    threshold = clamped / (1.0 - share) / 2e-7
    pump = times * threshold
    steady = steady_state(laser, np.array([pump]))
    upper, photons = settled(laser, pump)
    assert upper == pytest.approx(float(steady.upper[0]), rel=1e-4)
    if times < 1.0:
        assert steady.photons[0] == 0.0
        assert photons == pytest.approx(1.0)
    else:
        assert photons == pytest.approx(float(steady.photons[0]), rel=1e-3)


def test_closed_form_four_level() -> None:
    """P = h nu (R - X_th / tau), X_th = area x loss / (2 sigma): Svelto section 7.3 (from memory)."""
    laser = resonator()
    loss = -np.log(0.9 * 0.98)
    threshold = 5e-7 * loss / (2.0 * 2.8e-23)
    assert float(laser.threshold_inversion[0]) == pytest.approx(threshold, rel=1e-12)
    pump = 3.0 * threshold / 230e-6
    power = PLANCK_J_S * LIGHT_M_S / 1064e-9 * 2.0 * threshold / 230e-6
    assert float(steady_state(laser, np.array([pump])).lost_w[0]) == pytest.approx(power, rel=1e-12)


@pytest.mark.parametrize("photons", 10.0 ** np.arange(2, 16, 2))
def test_two_level_medium_never_passes_one_half(photons: float) -> None:
    """Driven by its own light alone, N2 = N S / (1 + 2 S) <= N / 2 (common practice, no source)."""
    total = 1e10
    laser = resonator(ions=total, lower_ratio=1.0, length_m=0.25)
    rate = float(laser.stimulated_per_s[0])
    until = np.array([min(8.0 * 230e-6, 40.0 / (2.0 * rate * photons))])
    # Without loss worth the name and with far more photons than ions the light stays as it is.
    laser.output_reflectance[:] = 1.0 - 1e-12
    laser.loss[:] = 0.0
    enough = max(photons, 1e13)
    trace = follow(laser, np.zeros(1), np.zeros(1), np.array([enough]), until)
    driven = rate * enough * 230e-6
    assert trace.peak[0, 0] <= total / 2.0
    if photons == enough:
        assert trace.state[0, 0] == pytest.approx(total * driven / (1.0 + 2.0 * driven), rel=1e-2)


def test_q_switched_pulse_against_its_closed_form() -> None:
    """x_i - x_f = ln(x_i / x_f) and peak x_i - 1 - ln x_i: Siegman chapter 26 (from memory).

    Inversion over threshold x, photons in units of the threshold inversion, no pump and no decay.
    """
    for above in (1.5, 3.0, 10.0, 60.0):
        laser = resonator(lifetime_s=10.0)
        unit = laser.threshold_inversion
        until = laser.photon_lifetime_s * (80.0 / (above - 1.0) + 120.0)
        trace = follow(laser, np.zeros(1), above * unit, np.ones(1), until, record=True)
        left = brentq(lambda x, a=above: a - x - np.log(a / x), 1e-30, 1.0)
        assert float(trace.state[2, 0] / unit[0]) == pytest.approx(above - left, rel=1e-4)
        assert float(trace.peak[1, 0] / unit[0]) == pytest.approx(above - 1.0 - np.log(above), rel=1e-3)


def test_integration_against_an_independent_solver() -> None:
    laser = resonator(lifetime_s=3e-6, length_m=1.0)
    unit, tau_c = float(laser.threshold_inversion[0]), float(laser.photon_lifetime_s[0])
    pump = 5.0 * unit / 3e-6

    def change(_: float, y: list[float]) -> list[float]:
        x, u = y
        light = np.exp(u)
        return [
            pump / unit - x / 3e-6 - x * light / tau_c / unit,
            (x - 1.0) / tau_c if u > 0 or x > 1 else 0.0,
        ]

    times = np.linspace(0.0, 4e-6, 9)[1:]
    other = solve_ivp(change, (0.0, 4e-6), [0.0, 0.0], "LSODA", times, rtol=1e-9, atol=1e-10, max_step=1e-8)
    for k, t in enumerate(times):
        trace = follow(laser, np.array([pump]), np.zeros(1), np.ones(1), np.array([t]), tolerance=1e-8)
        assert float(trace.state[0, 0]) / unit == pytest.approx(other.y[0, k], rel=1e-3)
