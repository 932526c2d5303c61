"""Bounds are bounds; published figures of crystals."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from service.files import DATA
from service.optics.gain_bounds import (
    Media,
    Pumps,
    diffraction_limit_rad,
    gain_bounds,
    saturation_fluence_j_m2,
    saturation_intensity_w_m2,
)
from service.optics.rate_equations import LIGHT_M_S, PLANCK_J_S, Resonators, follow, steady_state
from service.rules.gain_media import gain_media
from tests.bounds.lasers import four_level_lasers, resonator


def test_ten_thousand_q_switched_lasers_stay_within_their_bounds() -> None:
    """Opened with all they can hold, pumped on, followed while the switch is open."""
    laser, pump, medium = four_level_lasers(10_000, seed=4)
    found = gain_bounds(laser, pump, medium)
    upper = steady_state(laser, pump.photons_per_s).dark_upper
    trace = follow(
        laser, pump.photons_per_s, upper, np.ones(10_000), pump.open_s, tolerance=1e-5, steps=20_000
    )
    assert (trace.time_s >= pump.open_s * 0.999).all()
    energy = trace.state[2] * laser.photon_j
    peak = trace.peak[1] * laser.photon_j / laser.photon_lifetime_s
    slack = 1.0 + 1e-4
    assert (energy <= found.pulse_j * slack).all()
    assert (upper * laser.photon_j <= found.stored_j * slack).all()
    assert (peak <= found.peak_w * slack).all()
    inside = peak / laser.loss_exponent
    assert (inside <= found.inside_peak_w * slack).all()
    # The bound is no idle one: most of these pulses come to more than a tenth of it.
    assert np.median(energy / found.pulse_j) > 0.1


def test_no_pulse_is_shorter_than_its_bound() -> None:
    """Full width at half maximum of pulses from just above threshold to far above."""
    for above in (1.1, 1.5, 3.0, 10.0, 100.0, 1000.0):
        laser = resonator(lifetime_s=1.0)
        upper = above * laser.threshold_inversion
        until = laser.photon_lifetime_s * (90.0 / (above - 1.0) + 60.0)
        trace = follow(laser, np.zeros(1), upper, np.ones(1), until, record=True, tolerance=1e-6)
        light = trace.states[1, 0]
        top = light.argmax()
        half = light.max() / 2.0
        rise = np.interp(half, light[: top + 1], trace.times[: top + 1])
        fall = np.interp(-half, -light[top:], trace.times[top:])
        pump = Pumps(*(np.array([v]) for v in (0.0, np.inf, np.inf, np.inf, 0.0)))
        medium = Media(np.array([np.inf]), np.array([0.05]), np.array([1e-3]))
        assert fall - rise >= float(gain_bounds(laser, pump, medium).shortest_s[0])


@pytest.mark.parametrize("ratio", [0.05, 0.3, 1.0])
def test_media_whose_lower_level_absorbs_stay_within_their_bounds(ratio: float) -> None:
    """Random quasi-three-level and three-level lasers, also in regular pulses."""
    draw = np.random.default_rng(8)
    count = 400
    base, _, _ = four_level_lasers(count, seed=8)
    ions = base.threshold_inversion * 10.0 ** draw.uniform(0.3, 1.5, count)
    laser = Resonators(
        base.wavelength_m,
        base.cross_section_m2,
        base.lifetime_s,
        ions,
        np.full(count, ratio),
        *(getattr(base, n) for n in Resonators.__slots__[5:]),
    )
    pump = Pumps(
        ions / base.lifetime_s * 10.0 ** draw.uniform(-1.0, 1.5, count),
        np.full(count, np.inf),
        np.full(count, np.inf),
        base.lifetime_s * 10.0 ** draw.uniform(-1.5, 1.0, count),
        base.photon_lifetime_s * 300.0,
    )
    medium = Media(ions, np.full(count, 0.05), np.full(count, 1e-3))
    found = gain_bounds(laser, pump, medium)
    upper = steady_state(laser, pump.photons_per_s).dark_upper
    emitted = np.zeros(count)
    for opening in range(5):
        trace = follow(laser, pump.photons_per_s, upper, np.ones(count), pump.open_s, tolerance=1e-5)
        energy = trace.state[2] * laser.photon_j
        # One photon of noise is lost again and again while the switch is open.
        noise = laser.photon_j * 2.0 * pump.open_s / laser.photon_lifetime_s
        assert (energy <= found.pulse_j * 1.0001 + noise).all()
        emitted += energy - noise
        assert (emitted <= (found.pulse_j + opening * found.regular_pulse_j) * 1.0001).all()
        rate = 1.0 / laser.lifetime_s + pump.photons_per_s / ions
        rest = pump.photons_per_s / rate
        upper = rest + (trace.state[0] - rest) * np.exp(-pump.hold_s * rate)


def test_ninety_nine_per_cent_mirror_holds_a_hundred_times_the_output() -> None:
    """Common practice, no source: one-way power inside = output / (1 - R)."""
    laser = resonator(output_reflectance=0.99, rear_reflectance=1.0, loss=0.0)
    pump = Pumps(*(np.array([v]) for v in (1e19, np.inf, np.inf, np.inf, 1e-6)))
    found = gain_bounds(laser, pump, Media(np.array([np.inf]), np.array([0.05]), np.array([1e-3])))
    assert float(found.inside_w[0] / found.power_w[0]) == pytest.approx(100.0, rel=1e-12)


def test_quantum_defect_limit_of_a_diode_pumped_neodymium_laser() -> None:
    """808 to 1064 nm: 76 % at most (Koechner, from memory; 808 / 1064 = 0.7594)."""
    laser = resonator()
    photons = 1.0 / (PLANCK_J_S * LIGHT_M_S / 808e-9)
    pump = Pumps(*(np.array([v]) for v in (photons, np.inf, np.inf, np.inf, 1e-6)))
    found = gain_bounds(laser, pump, Media(np.array([np.inf]), np.array([0.05]), np.array([1e-3])))
    assert float(found.power_w[0]) == pytest.approx(0.7594, abs=5e-5)


def test_saturation_of_neodymium_yag() -> None:
    """0.67 J/cm2 and 2.9 kW/cm2 with 2.8e-19 cm2 and 230 us (Koechner, from memory)."""
    one = np.ones(1)
    fluence = saturation_fluence_j_m2(1064e-9 * one, 2.8e-23 * one, 0.0 * one)
    intensity = saturation_intensity_w_m2(1064e-9 * one, 2.8e-23 * one, 0.0 * one, 230e-6 * one)
    assert float(fluence[0]) == pytest.approx(0.67e4, abs=0.005e4)
    assert float(intensity[0]) == pytest.approx(2.9e7, abs=0.05e7)


def test_fully_inverted_ruby_holds_4_52_joules_per_cubic_centimetre() -> None:
    """1.58e19 ions per cm3 x 2.86e-19 J = 4.52 J/cm3, half of it can be extracted (Koechner, from memory)."""
    volume = 1e-6
    density = gain_media(DATA).media["ruby"].value("density_cm3")
    assert density is not None
    ions = density * 1e6 * volume
    laser = resonator(wavelength_m=694.3e-9, ions=ions, lower_ratio=1.0, lifetime_s=3e-3)
    pump = Pumps(*(np.array([v]) for v in (1e25, np.inf, np.inf, np.inf, 0.0)))
    found = gain_bounds(laser, pump, Media(np.array([ions]), np.array([0.01]), np.array([1e-2])))
    assert float(found.stored_j[0]) == pytest.approx(4.52, abs=0.005)
    assert float(found.pulse_j[0]) == pytest.approx(2.26, abs=0.005)


def test_pump_pulses_that_follow_each_other_fast_add_up() -> None:
    """R t sum of exp(-k period / tau): a geometric series, summed here term by term."""
    laser = resonator(lifetime_s=1e-2)
    pump = Pumps(*(np.array([v]) for v in (1e18, 1e-4, 1e-3, np.inf, 0.0)))
    found = gain_bounds(laser, pump, Media(np.array([np.inf]), np.array([0.05]), np.array([1e-3])))
    total = 1e18 * 1e-4 * sum(np.exp(-0.1 * k) for k in range(400))
    assert float(found.stored_j[0] / laser.photon_j[0]) == pytest.approx(total, rel=1e-9)


def test_amplified_spontaneous_emission_is_the_sum_along_the_medium() -> None:
    """Quadrature of exp(g z) over the medium, times the cone over the whole sphere."""
    laser = resonator(rear_reflectance=1e-300)
    laser.rear_reflectance[:] = 0.0
    upper = 4e14
    pump = Pumps(*(np.array([v]) for v in (upper / 230e-6, np.inf, np.inf, np.inf, 0.0)))
    with np.errstate(divide="ignore", invalid="ignore"):
        found = gain_bounds(laser, pump, Media(np.array([np.inf]), np.array([0.05]), np.array([8e-4])))
    gain = 2.8e-23 * upper / (np.pi / 4 * 8e-4**2 * 0.05)
    path = np.hypot(0.05, 8e-4)
    mean = quad(lambda z: np.exp(gain * z), 0.0, path)[0] / path
    cone = 2.0 * np.pi * (1.0 - np.cos(np.arctan(8e-4 / 0.05))) / (4.0 * np.pi)
    assert float(found.spontaneous_share[0]) == pytest.approx(mean * cone, rel=1e-9)


def test_diffraction_limit() -> None:
    """4 lambda / (pi d): 1064 nm from 1 mm gives 1.3547 mrad (worked by hand)."""
    assert float(diffraction_limit_rad(np.array([1064e-9]), np.array([1e-3]))[0]) == pytest.approx(
        1.3547e-3, abs=5e-8
    )
