"""Scale numbers of eyewear that published tables print for lasers in use, and the ends of the scales.

The three lasers are rows of a table for practice (DGUV Information 203-042, section 3, read). They need
the size factor of wide beams, which is from memory: d^1.7, d in mm, held at 15 mm.
"""

from __future__ import annotations

import math

import pytest

from service.contract.protection import ScaleNumber
from tests.published.cases import CASES, Case, check, pinned
from tests.published.product import EU, cw, evaluate, pulse

#: From memory: 15^1.7 = 99.85, the largest factor.
LARGEST = 15**1.7


def continuous(wavelength_nm: float, power_w: float, d63_mm: float) -> ScaleNumber:
    """What mode D asks for at the exit of a beam with this d63, that is its 1/e diameter."""
    result = evaluate(EU, wavelength_nm, cw(power_w), diameter_mm=d63_mm)
    (found,) = result.protection.lines[0].worst_place.scale_numbers
    assert found.mode == "D"
    return found


@pinned("DGUV-AR-7", "DGUV-CO2-500B", "DGUV-YAG-600")
def test_lasers_in_use(case: Case) -> None:
    """The printed number, which the scale table alone, without the size factor, falls short of."""
    given = case.inputs
    found = continuous(given["wavelength_nm"], given["power_W"], given["beam_diameter_mm"])
    irradiance = given["power_W"] / (math.pi / 4 * (given["beam_diameter_mm"] * 1e-3) ** 2)
    assert found.value == pytest.approx(irradiance, rel=1e-12)
    assert found.size_factor == pytest.approx(LARGEST, rel=1e-12)
    check(case, found.scale_number_wide_beam, 0.0)
    assert found.scale_number < case.printed_value


@pinned("EN207-EXP")
def test_largest_irradiance_of_a_number(case: Case) -> None:
    """1e7 W/m2 on a d63 of 1 mm, where no size factor counts, is LB6; a thousandth more is LB7."""
    power = case.printed_value * math.pi / 4 * 1e-6
    found = continuous(case.inputs["wavelength_nm"], power, 1.0)
    check(case, found.value, 1e-3)
    assert found.scale_number_wide_beam == case.inputs["scale"]
    assert continuous(case.inputs["wavelength_nm"], power * 1.001, 1.0).scale_number == 7


@pytest.mark.parametrize("pulse_s", [1e-9, 1e-6, 2e-4])
def test_largest_pulse_energy_of_alignment_eyewear(pulse_s: float) -> None:
    """EN208-RB1-Q (its limit is pinned with the powers): 2e-6 J is RB1 from 1 ns to 0.2 ms, more is RB2."""
    case = CASES["EN208-RB1-Q"]
    for share, number in ((1.0, 1), (1.001, 2)):
        result = evaluate(EU, 532, pulse(pulse_s, case.printed_value * share))
        alignment = result.protection.lines[0].worst_place.alignment
        assert alignment is not None
        check(case, alignment.value, 0.0021 * case.printed_value)
        assert (alignment.unit, alignment.scale_number) == (case.unit, number)
