"""Bounds and solutions of the rate equations as figures with the way they follow."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any, Literal

from service.contract.bounds import BoundsRequest
from service.contract.bounds_result import Figure
from service.optics.gain_bounds import (
    GainBounds,
    Pumps,
    saturation_fluence_j_m2,
    saturation_intensity_w_m2,
)
from service.optics.rate_equations import Resonators, steady_state

__all__ = ["bound_figures", "computed_figures"]

COUNTED = "photons counted: no pump photon gives more than the quantum yield"
SVELTO = "Svelto, Principles of Lasers, chapters 7 and 8 (from memory)"
SIEGMAN = "Siegman, Lasers, chapters 10 and 26 (from memory)"

Kind = Literal["upper bound", "lower bound", "computed"]


def _figures(kind: Kind, rows: Iterator[tuple[str, str, Any, str, str, str]]) -> list[Figure]:
    return [
        Figure(
            symbol=symbol,
            name=name,
            value=float(value) if math.isfinite(float(value)) else None,
            unit=unit,
            kind="lower bound" if kind == "upper bound" and symbol.startswith(("t_", "T_")) else kind,
            text=text,
            source=source,
        )
        for symbol, name, value, unit, text, source in rows
    ]


def bound_figures(request: BoundsRequest, laser: Resonators, pump: Pumps, found: GainBounds) -> list[Figure]:
    """Every bound of one laser."""
    return _figures("upper bound", _bounds(request, laser, pump, found))


def _bounds(
    request: BoundsRequest, laser: Resonators, pump: Pumps, found: GainBounds
) -> Iterator[tuple[str, str, Any, str, str, str]]:
    during = "" if request.pump.mode == "cw" else " while the pump pulse lasts"
    yield (
        "P",
        f"Laser power{during}",
        found.power_w[0],
        "W",
        "pump photons per second x quantum yield x h c / λ",
        COUNTED,
    )
    yield (
        "Q_stored",
        "Energy stored in the upper level",
        found.stored_j[0],
        "J",
        "R τ h c / λ, for pulsed pumps all photons of a pulse and what earlier ones left; never more "
        "than all ions excited",
        COUNTED,
    )
    kappa = float(laser.lower_ratio[0])
    cost = f" / (1 + {kappa:g}), the rest is paid to reach transparency;" if kappa else ""
    yield (
        "Q",
        "Energy of one Q-switched or first pulse",
        found.pulse_j[0],
        "J",
        f"stored energy{cost} + what is pumped while the switch is open",
        COUNTED,
    )
    if (
        request.q_switch is not None and request.q_switch.rate_hz is not None
    ) or request.pump.rate_hz is not None:
        yield (
            "Q_train",
            "Energy of one pulse of the train",
            found.regular_pulse_j[0],
            "J",
            "pumped from one pulse to the next and while the switch is open",
            COUNTED,
        )
    yield (
        "t_p",
        "Shortest Q-switched pulse (full width at half maximum)",
        found.shortest_s[0],
        "s",
        "τ_c ln 2: after its peak a pulse falls no faster than an empty resonator",
        SVELTO,
    )
    yield (
        "t_rt",
        "Shortest way to empty the resonator at once",
        found.round_trip_s[0],
        "s",
        "round trip 2 L / c",
        SIEGMAN,
    )
    yield "P_peak", "Peak power outside", found.peak_w[0], "W", "Q / τ_c", SVELTO
    yield (
        "P_in",
        f"One-way power inside{during}",
        found.inside_w[0],
        "W",
        "P / (1 - R1 R2 (1 - loss)): the pump must supply what each round trip loses",
        COUNTED,
    )
    yield (
        "P_in_peak",
        "One-way peak power inside",
        found.inside_peak_w[0],
        "W",
        "P_peak / (1 - R1 R2 (1 - loss))",
        COUNTED,
    )
    yield (
        "P_rear",
        f"Power through the rear mirror{during}",
        (found.power_w * found.rear_share)[0],
        "W",
        "P_in (1 - R2), never more than P",
        COUNTED,
    )
    yield (
        "P_ASE",
        f"Amplified spontaneous emission from one end{during}",
        (found.power_w * found.spontaneous_share)[0],
        "W",
        "what the upper ions emit into the cone of the medium, amplified over its length (there and back), "
        "never more than P",
        SVELTO,
    )


def computed_figures(
    laser: Resonators, pump: Pumps, stored: Any, pulse: dict[str, float] | None
) -> list[Figure]:
    """Closed forms and solutions of the rate equations; no bounds."""
    return _figures("computed", _computed(laser, pump, stored, pulse))


def _computed(
    laser: Resonators, pump: Pumps, stored: Any, pulse: dict[str, float] | None
) -> Iterator[tuple[str, str, Any, str, str, str]]:
    steady = steady_state(laser, pump.photons_per_s)
    above = laser.inversion(stored) / laser.threshold_inversion
    fluence = saturation_fluence_j_m2(laser.wavelength_m, laser.cross_section_m2, laser.lower_ratio)
    intensity = saturation_intensity_w_m2(
        laser.wavelength_m, laser.cross_section_m2, laser.lower_ratio, laser.lifetime_s
    )
    yield "tau_c", "Photon lifetime", laser.photon_lifetime_s[0], "s", "round trip / loss exponent", SIEGMAN
    yield (
        "r",
        "Inversion without light over inversion at threshold",
        above[0],
        "1",
        "from R τ, the density and the mode",
        SVELTO,
    )
    yield (
        "P_steady",
        "Continuous power through the output mirror",
        (steady.lost_w * laser.output_share)[0],
        "W",
        "closed-form steady state while the pump is on",
        SVELTO,
    )
    yield (
        "P_in_steady",
        "Continuous one-way power inside",
        (steady.lost_w / laser.loss_exponent)[0],
        "W",
        "steady state, mean over the resonator",
        SVELTO,
    )
    if pulse is not None:
        how = "rate equations, integrated from the opening of the resonator"
        yield "Q_sim", "Energy of the first pulse", pulse["energy_j"], "J", how, SVELTO
        yield "P_sim", "Its peak power", pulse["peak_w"], "W", how, SVELTO
        yield "t_sim", "Its full width at half maximum", pulse["width_s"], "s", how, SVELTO
        yield "t_build", "Build-up from one photon to its peak", pulse["build_up_s"], "s", how, SVELTO
    yield "F_sat", "Saturation fluence", fluence[0], "J/m2", "h c / (λ σ (1 + κ))", SIEGMAN
    yield "I_sat", "Saturation intensity", intensity[0], "W/m2", "F_sat / τ", SIEGMAN
