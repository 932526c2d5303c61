"""Limits times an aperture area: the largest power or energy that may enter the aperture.

The product's answer is the power divided by the hazard ratio of a beam much narrower than the aperture.
"""

from __future__ import annotations

from typing import Any

from tests.published.cases import Case, check, pinned
from tests.published.product import EU, IEC, cw, evaluate, pulse

#: Any visible wavelength, where a source names none.
VISIBLE_NM = 532


def allowed(rules: str, wavelength_nm: float, emission: dict[str, Any], exposure_s: float | None) -> float:
    """Largest power [W] of a continuous beam, or energy [J] of a pulse, through the limiting aperture."""
    result = evaluate(rules, wavelength_nm, emission, exposure_s)
    emitted = emission["power_w"] if emission["mode"] == "cw" else emission["energy_j"]
    return emitted / result.eye.hazard_ratio


POWERS = {
    # 18 x 0.25^-0.25 x 38.48 mm2 = 0.980 mW, printed 1 mW: held to two digits.
    "DGUV-CL2": (IEC, VISIBLE_NM, 0.25, 0.05),
    # 0.490 mW by the formula: the printed 0.5 is 2 % above the limit.
    "DGUV-4S": (EU, VISIBLE_NM, 4.0, None),
    # 38.48 mm2 x 1 W/m2 = 0.0385 mW; the tables of class limits print 3.9e-5 W, rounded up by 1.3 %.
    "FMA-AEL1": (IEC, 450.0, 100.0, 0.001),
    # The same area: 10 W/m2 x 38.48 mm2 = 0.385 mW, printed 0.39 (rounded up by 1.3 %).
    "AEL1-633": (IEC, 633.0, 100.0, 0.01),
    # 0.39 C4 mW with C4 = 10^0.3 = 1.995 is 0.778; by the area 0.768: the same 1.3 %, then rounded to 0.78.
    "AEL1-850": (IEC, 850.0, 100.0, 0.015),
}


@pinned(*POWERS)
def test_power_through_the_eye_aperture(case: Case) -> None:
    rules, wavelength, exposure, tolerance = POWERS[case.id]
    assert case.inputs.get("wavelength_nm", VISIBLE_NM) == wavelength
    assert case.inputs.get("exposure_s", exposure) == exposure
    check(case, allowed(rules, wavelength, cw(), exposure), tolerance)


@pinned("EN208-RB1-Q")
def test_pulse_energy_behind_a_filter(case: Case) -> None:
    """RB1 lets one tenth through: 5e-3 J/m2 x 38.48 mm2 x 10 = 1.92e-6 J, printed 2e-6.

    The limit from 1 ns to 18 us; the printed energy rests on it up to 0.2 ms, on the safe side.
    """
    energy = allowed(EU, VISIBLE_NM, pulse(1e-8), None)
    check(case, energy / case.inputs["transmittance"])
