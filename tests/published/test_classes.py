"""Printed class limits, asked of the class engine itself: the power at which the class ends.

`test_powers.py` asks the same numbers of the exposure limits, times the area of the aperture; the tables of
class limits round that product, so that only here the printed digits come out.
"""

from __future__ import annotations

import math

import pytest

from service.contract.classification import ClassLevel
from tests.published.cases import CASES, Case, check, pinned
from tests.published.product import cw, evaluate, pulse

#: Exposure limits of a request say nothing about its class; any rule set serves.
RULES = "iec-60825-1-2014"
SCHEMES = ("iec-60825-1-2014", "us-21cfr1040")
#: Any visible wavelength, where a source names none.
VISIBLE_NM = 532


def level(name: str, wavelength_nm: float, scheme: str = SCHEMES[0], **beam: float) -> ClassLevel:
    """What 1 mW of a continuous beam makes of the limits of a class."""
    result = evaluate(RULES, wavelength_nm, cw(1e-3), **beam)
    (found,) = (c for c in result.classification if c.scheme == scheme)
    (of_class,) = (x for x in found.levels if x.limits == name)
    return of_class


def ends_at(name: str, wavelength_nm: float, scheme: str = SCHEMES[0], **beam: float) -> float:
    """Largest power [W] at which the limits of a class hold."""
    return 1e-3 / level(name, wavelength_nm, scheme, **beam).ratio


# Class, and the wavelength where the case has none.
ENDS = {
    # 3.9e-5 C3 W at 450 nm, C3 = 1: printed for all of the visible, true up to 450 nm
    "FMA-AEL1": ("1", 450),
    "AEL1-633": ("1", 633),
    # 0.39 C4 mW, C4 = 10^0.3
    "AEL1-850": ("1", 850),
    # 1 mW, as the table of Class 2 prints it
    "DGUV-CL2": ("2", VISIBLE_NM),
    "AEL3R": ("3R", 633),
}
PINNED_BY_POWER = [name for name in ENDS if name != "AEL3R"]


def check_end(case: Case) -> None:
    name, wavelength = ENDS[case.id]
    assert case.inputs.get("wavelength_nm", VISIBLE_NM) == wavelength
    found = level(name, wavelength)
    assert (found.rule, found.unit) == ("exposure", "W")
    assert found.limit is not None
    # The printed limit, and the power that a beam narrower than any aperture may have.
    check(case, found.limit)
    check(case, ends_at(name, wavelength))


@pytest.mark.parametrize("case", [CASES[i] for i in PINNED_BY_POWER], ids=PINNED_BY_POWER)
def test_class_limit_in_its_printed_digits(case: Case) -> None:
    """Half a unit in the last printed digit, where the exposure limits need an allowance for rounding."""
    check_end(case)


@pinned("AEL3R")
def test_class_limit_that_is_no_limit_times_an_area(case: Case) -> None:
    """Five times Class 2: 5 mW."""
    check_end(case)
    assert ends_at("3R", 633) == pytest.approx(5 * ends_at("2", 633), rel=1e-12)


def test_a_fibre_at_1550_nm_reaches_hazard_level_1m_at_its_printed_power() -> None:
    """FIB-1550-1M: 10 mW through 3.5 mm at 100 mm, behind a single-mode fibre of 11 um mode field.

    The same numbers hold for Class 1M of IEC 60825-1:2014 without a telescope (Tables 3 and 10, from
    memory). Full angle of a Gaussian beam at 1/e2: 4 lambda / (pi d).
    """
    case = CASES["FIB-1550-1M"]
    wavelength, mode_um = case.inputs["wavelength_nm"], case.inputs["mode_field_diameter_um"]
    angle = 4 * wavelength * 1e-9 / (math.pi * mode_um * 1e-6) * 1e3
    fibre = {"diameter_mm": mode_um * 1e-3, "divergence_mrad": angle, "level": "1/e2"}
    found = level("1", wavelength, **fibre)
    # At 2 m the telescope of 24.5 mm takes less than the eye at 100 mm, so that the eye decides.
    assert found.condition == "3"
    check(case, ends_at("1", wavelength, **fibre))


def test_powers_on_the_labels_of_both_schemes() -> None:
    """400-710 nm, 1 mW / 5 mW / 500 mW (a maker's note, read): II, IIIa, IIIb end as 2, 3R, 3B do."""
    for ours, theirs, power in (("2", "II", 1e-3), ("3R", "IIIa", 5e-3), ("3B", "IIIb", 0.5)):
        assert ends_at(ours, 650) == pytest.approx(power, rel=1e-12)
        assert ends_at(theirs, 650, SCHEMES[1]) == pytest.approx(power, rel=1e-12)


def test_a_pulse_of_a_range_finder_at_905_nm() -> None:
    """One pulse below 5 us: 7.7e-8 C4 J for Class 1, C4 = 10^0.41 (IEC Table 3, from memory)."""
    result = evaluate(RULES, 905, pulse(1e-7, 1e-7))
    found = result.classification[0].levels[0]
    assert found.limit == pytest.approx(7.7e-8 * 10**0.41, rel=1e-12)
    assert result.classification[0].hazard_class == "1"
