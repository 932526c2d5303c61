"""Upper bounds for a laser that nobody has measured, from its pump, medium and resonator. For arrays.

Every bound follows from counting photons: each pump photon that reaches the upper level gives at most
one laser photon (`quantum_yield` where a medium gives more), and light can leave a resonator no faster
than its losses let it. Nothing here assumes a mode, a pulse shape or a quality of alignment.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.optics.rate_equations import LIGHT_M_S, PLANCK_J_S, Resonators

__all__ = [
    "GainBounds",
    "Media",
    "Pumps",
    "diffraction_limit_rad",
    "gain_bounds",
    "saturation_fluence_j_m2",
    "saturation_intensity_w_m2",
]

Floats = NDArray[np.float64]

LN2 = float(np.log(2.0))


@dataclass(slots=True)
class Pumps:
    """One pump per element; all arrays (n,).

    `photons_per_s`: pump photons that reach the upper level [1/s], times the quantum yield, while the
    pump is on. `pulse_s`: length of the pump pulse [s], infinite for a continuous pump; `period_s`: from
    one pump pulse to the next [s], infinite for a single one. `hold_s`: pause between two laser pulses in
    regular operation [s]. `open_s`: how long a Q-switch stays open [s].
    """

    photons_per_s: Floats
    pulse_s: Floats
    period_s: Floats
    hold_s: Floats
    open_s: Floats


@dataclass(slots=True)
class Media:
    """Geometry of the medium: all ions there are and the path through it.

    `ions`: in the whole medium, infinite where unknown. `length_m`, `diameter_m`: of the part that is
    pumped [m].
    """

    ions: Floats
    length_m: Floats
    diameter_m: Floats


@dataclass(slots=True)
class GainBounds:
    """Upper bounds (lower ones for durations); all arrays (n,).

    `power_w`: laser light while the pump is on. `stored_j`: energy in the upper level. `pulse_j`: one
    Q-switched (or first) pulse; `regular_pulse_j`: mean of a train. `shortest_s`: shortest full
    width at half maximum of a Q-switched pulse; `round_trip_s`: shortest way to empty the resonator at
    once. `peak_w`: highest peak power outside. `inside_w`, `inside_peak_w`: one-way power inside,
    continuous and at the peak. `rear_share`: most of the power that can leave through the rear mirror.
    `single_pass_gain`: largest gain of one pass. `spontaneous_share`: largest share of the power that
    leaves one end as amplified spontaneous emission within the cone `spontaneous_rad` (full angle).
    """

    power_w: Floats
    stored_j: Floats
    pulse_j: Floats
    regular_pulse_j: Floats
    shortest_s: Floats
    round_trip_s: Floats
    peak_w: Floats
    inside_w: Floats
    inside_peak_w: Floats
    rear_share: Floats
    single_pass_gain: Floats
    spontaneous_share: Floats
    spontaneous_rad: Floats


def saturation_fluence_j_m2(wavelength_m: Floats, cross_section_m2: Floats, lower_ratio: Floats) -> Floats:
    """Saturation fluence [J/m2]: h c / (lambda sigma (1 + kappa)).

    Reference: Siegman, Lasers, section 10.1 (from memory).
    """
    return PLANCK_J_S * LIGHT_M_S / (wavelength_m * cross_section_m2 * (1.0 + lower_ratio))


def saturation_intensity_w_m2(
    wavelength_m: Floats, cross_section_m2: Floats, lower_ratio: Floats, lifetime_s: Floats
) -> Floats:
    """Saturation intensity [W/m2]: saturation fluence / lifetime of the upper level.

    Reference: Koechner, Solid-State Laser Engineering, section 3.1 (from memory).
    """
    return saturation_fluence_j_m2(wavelength_m, cross_section_m2, lower_ratio) / lifetime_s


def diffraction_limit_rad(wavelength_m: Floats, diameter_m: Floats) -> Floats:
    """Least full angle [rad] of a beam of this 1/e2 diameter [m]: 4 lambda / (pi d).

    Reference: ISO 11146 with M2 = 1 (from memory).
    """
    return 4.0 * wavelength_m / (np.pi * diameter_m)


def gain_bounds(laser: Resonators, pump: Pumps, medium: Media) -> GainBounds:
    """All bounds of one or many lasers.

    - Power: every pump photon becomes a laser photon, whatever the threshold.
    - Stored: R tau ions at most; of pulsed pumps all photons of a pulse and what earlier ones left,
      R t / (1 - exp(-period / tau)); and never more than there are. What is extracted leaves the lower
      level fuller by as much as the upper one loses, so a medium whose lower level absorbs gives at most
      1 / (1 + kappa) of it (one half with three levels): the other part is paid to reach transparency.
    - Q-switched pulse: that, and what is pumped while the switch is open.
    - Regular pulses share the pump: at most what is pumped from one to the next, R tau (1 - exp(-hold /
      tau)); the cost of transparency is then paid once and not counted.
    - Duration: after its peak a pulse falls no faster than an empty resonator does, exp(-t / tau_c), so
      its width at half maximum is at least tau_c ln 2; its peak is at most its energy / tau_c.
    - Inside: light that leaves the output mirror's side for one round trip loses at least
      1 - R1 R2 (1 - loss), all of which the pump must supply.
    - Amplified spontaneous emission: what all upper ions emit into the cone of the medium, amplified over
      its whole length (there and back with a rear mirror), never more than the pump supplies.

    Reference: Svelto, Principles of Lasers, sections 7.3, 8.4 and 2.9.2 (from memory); derived there for
    uniform pumping, here as inequalities.
    """
    hv, tau, kappa = laser.photon_j, laser.lifetime_s, laser.lower_ratio
    rate = pump.photons_per_s
    shared = 1.0 / (1.0 + kappa)
    upper = np.minimum(rate * np.minimum(tau, pump.pulse_s / -np.expm1(-pump.period_s / tau)), medium.ions)
    pumped_open = rate * np.minimum(pump.open_s, pump.pulse_s)
    held = rate * np.minimum(-tau * np.expm1(-pump.hold_s / tau), pump.pulse_s)
    one_pulse = hv * (shared * upper + pumped_open)
    regular = np.minimum(hv * (np.minimum(held, shared * medium.ions) + pumped_open), one_pulse)
    trip = laser.round_trip_s
    lost = -np.expm1(-laser.loss_exponent)
    peak = one_pulse / laser.photon_lifetime_s
    power = rate * hv
    mirror = np.where(laser.rear_reflectance > 0.0, 2.0, 1.0)
    area = np.pi / 4.0 * medium.diameter_m**2
    path = np.hypot(medium.length_m, medium.diameter_m)
    exponent = np.minimum(laser.cross_section_m2 * upper / (area * medium.length_m) * path, 600.0)
    half_angle = np.arctan(medium.diameter_m / medium.length_m)
    cone = 0.5 * (1.0 - np.cos(half_angle))
    with np.errstate(over="ignore"):
        amplified = np.expm1(np.minimum(mirror * exponent, 600.0)) / np.maximum(mirror * exponent, 1e-300)
        share = np.minimum(1.0, mirror * cone * np.maximum(amplified, 1.0))
    return GainBounds(
        power_w=power,
        stored_j=hv * upper,
        pulse_j=one_pulse,
        regular_pulse_j=regular,
        shortest_s=laser.photon_lifetime_s * LN2,
        round_trip_s=trip,
        peak_w=peak,
        inside_w=power / lost,
        inside_peak_w=peak / lost,
        rear_share=np.minimum(1.0, (1.0 - laser.rear_reflectance) / lost),
        single_pass_gain=np.exp(exponent),
        spontaneous_share=share,
        spontaneous_rad=2.0 * half_angle,
    )
