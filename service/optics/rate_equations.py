"""Rate equations of a laser resonator: steady state, transients and Q-switched pulses, for arrays.

State: ions in the upper level X, laser photons in the resonator q, photons lost from it so far.

    dX/dt = R (1 - X / X_t) - X / tau - b q Y,    Y = X - kappa (X_t - X)
    dq/dt = q (b Y - 1 / tau_c)

R is the rate of pump photons that reach the upper level, tau its lifetime, Y the inversion and b the
stimulated rate per photon. kappa tells how strongly the ions that are left below absorb at the laser
wavelength: 0 four-level, 1 three-level, between for quasi-three-level media. A two-level medium is
kappa = 1 driven by its own light alone (R = 0): X never exceeds X_t / 2.

Reference: Svelto, Principles of Lasers, chapters 7 and 8; Siegman, Lasers, chapters 24 to 26 (both from
memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.optics.runge_kutta import Trace, integrate

__all__ = ["LIGHT_M_S", "PLANCK_J_S", "Resonators", "SteadyState", "follow", "steady_state"]

Floats = NDArray[np.float64]

#: Exact by definition of the SI (2019).
LIGHT_M_S = 299_792_458.0
PLANCK_J_S = 6.626_070_15e-34
#: ln q is held below this while a step is tried that is too long.
LARGEST = 100.0


@dataclass(slots=True)
class Resonators:
    """One resonator with its medium per element; all arrays 1-d of equal length.

    `wavelength_m` vacuum laser wavelength [m]; `cross_section_m2` stimulated emission [m2]; `lifetime_s`
    of the upper level [s]; `ions` X_t taking part in the mode (infinite: a four-level medium that is
    never depleted); `lower_ratio` kappa; `mode_area_m2` area of the mode in the medium [m2]; `length_m`
    optical length of the resonator, one way [m]; `output_reflectance`, `rear_reflectance` of the
    mirrors; `loss` other loss per round trip (0 to 1).
    """

    wavelength_m: Floats
    cross_section_m2: Floats
    lifetime_s: Floats
    ions: Floats
    lower_ratio: Floats
    mode_area_m2: Floats
    length_m: Floats
    output_reflectance: Floats
    rear_reflectance: Floats
    loss: Floats

    @property
    def photon_j(self) -> Floats:
        """Energy of a laser photon [J]: h c / lambda."""
        return PLANCK_J_S * LIGHT_M_S / self.wavelength_m

    @property
    def round_trip_s(self) -> Floats:
        """Duration of a round trip [s]: 2 L / c."""
        return 2.0 * self.length_m / LIGHT_M_S

    @property
    def loss_exponent(self) -> Floats:
        """Logarithmic loss of a round trip [1]: -ln(R1 R2 (1 - loss))."""
        return -np.log(self.output_reflectance * self.rear_reflectance * (1.0 - self.loss))

    @property
    def photon_lifetime_s(self) -> Floats:
        """Lifetime tau_c of a photon in the resonator [s]: round trip / loss exponent."""
        return self.round_trip_s / self.loss_exponent

    @property
    def output_share(self) -> Floats:
        """Share of the lost photons that leave through the output mirror [1]: -ln R1 / loss exponent."""
        return -np.log(self.output_reflectance) / self.loss_exponent

    @property
    def stimulated_per_s(self) -> Floats:
        """Stimulated rate b per photon and ion [1/s]: sigma c l / (L V) with V = area x l."""
        return self.cross_section_m2 * LIGHT_M_S / (self.length_m * self.mode_area_m2)

    @property
    def threshold_inversion(self) -> Floats:
        """Inversion Y at which gain equals loss [ions]: 1 / (b tau_c)."""
        return 1.0 / (self.stimulated_per_s * self.photon_lifetime_s)

    def inversion(self, upper: Floats) -> Floats:
        """Inversion Y [ions] with `upper` ions in the upper level."""
        return upper * (1.0 + self.lower_ratio) - self.lower_ratio * self.absorbing

    @property
    def absorbing(self) -> Floats:
        """Ions X_t where those left below absorb, 0 in four-level media [ions]."""
        return np.where(self.lower_ratio > 0.0, self.ions, 0.0)

    def upper_at(self, inversion: Floats) -> Floats:
        """Ions in the upper level at an inversion Y: (Y + kappa X_t) / (1 + kappa)."""
        return (inversion + self.lower_ratio * self.absorbing) / (1.0 + self.lower_ratio)


@dataclass(slots=True)
class SteadyState:
    """Continuous operation: `upper` ions, `photons` inside, `lost_w` power leaving altogether [W].

    `dark_upper` are the ions in the upper level without any laser light.
    """

    upper: Floats
    photons: Floats
    lost_w: Floats
    dark_upper: Floats


def steady_state(laser: Resonators, pump_per_s: Floats) -> SteadyState:
    """Closed-form steady state under a constant pump.

    Below threshold X = R / (1 / tau + R / X_t), q = 0. Above it the gain is clamped to the loss:
    X = X_th and q = tau_c (R (1 - X_th / X_t) - X_th / tau).

    Parameters
    ----------
    laser : resonators, (n,)
    pump_per_s : (n,) pump photons reaching the upper level [1/s]

    Reference: Svelto, Principles of Lasers, section 7.3 (from memory).
    """
    dark = pump_per_s / (1.0 / laser.lifetime_s + pump_per_s / laser.ions)
    clamped = laser.upper_at(laser.threshold_inversion)
    rate = pump_per_s * (1.0 - clamped / laser.ions) - clamped / laser.lifetime_s
    lases = (dark > clamped) & (rate > 0.0)
    lost = np.where(lases, rate, 0.0)
    return SteadyState(
        upper=np.where(lases, clamped, dark),
        photons=lost * laser.photon_lifetime_s,
        lost_w=lost * laser.photon_j,
        dark_upper=dark,
    )


def follow(
    laser: Resonators,
    pump_per_s: Floats,
    upper: Floats,
    photons: Floats,
    until_s: Floats,
    *,
    pump_s: Floats | None = None,
    record: bool = False,
    steps: int = 20_000,
    tolerance: float = 1e-6,
) -> Trace:
    """Integrate the rate equations from a given state.

    The light is followed as ln q, which keeps it positive through many decades; it never falls below
    the one photon that spontaneous emission keeps in the resonator.

    Parameters
    ----------
    laser : resonators, (n,)
    pump_per_s : (n,) pump photons reaching the upper level [1/s]
    upper, photons : (n,) state at time 0; at least one photon is taken
    until_s : (n,) end [s]
    pump_s : (n,) end of the pump pulse [s]; None for a pump that stays on
    record : keep every accepted step (for a single resonator)
    steps : most steps; what is not finished then stops where it is
    tolerance : local error of a step, relative to the threshold inversion

    Returns
    -------
    Trace with the columns upper ions, photons, photons lost so far.
    """
    unit = np.maximum(laser.threshold_inversion, 1.0)
    b, tau_c, kappa = laser.stimulated_per_s, laser.photon_lifetime_s, laser.lower_ratio
    lower = kappa * laser.absorbing

    def change(time: Floats, state: Floats, k: NDArray[np.intp]) -> Floats:
        x, u, _ = state
        ions = x * unit[k]
        inversion = ions * (1.0 + kappa[k]) - lower[k]
        q = np.exp(np.minimum(u, LARGEST))
        pump = pump_per_s[k] * (1.0 - ions / laser.ions[k])
        if pump_s is not None:
            pump = np.where(time < pump_s[k], pump, 0.0)
        growth = b[k] * inversion - 1.0 / tau_c[k]
        growth = np.where((u <= 0.0) & (growth < 0.0), 0.0, growth)
        upper_change = (pump - ions / laser.lifetime_s[k] - b[k] * q * inversion) / unit[k]
        return np.stack([upper_change, growth, q / tau_c[k] / unit[k]])

    start = np.stack([upper / unit, np.log(np.maximum(photons, 1.0)), np.zeros_like(upper)])
    trace = integrate(change, start, until_s, tolerance=tolerance, steps=steps, record=record)
    scale = unit[:1, None]
    for column in (0, 2):
        trace.state[column] *= unit
        trace.peak[column] *= unit
        trace.states[column] *= scale
    trace.state[1], trace.peak[1] = np.exp(trace.state[1]), np.exp(trace.peak[1])
    trace.states[1] = np.exp(trace.states[1])
    return trace
