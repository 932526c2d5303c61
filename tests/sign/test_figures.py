"""Figures of a sign: rounded to the safe side, with prefixes, and never to be misread."""

from __future__ import annotations

from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.sign.figures import density, exact, measure, number, wavelength

PREFIX = {"T": 12, "G": 9, "M": 6, "k": 3, "": 0, "m": -3, "µ": -6, "n": -9, "p": -12, "f": -15, "a": -18}


@pytest.mark.parametrize(
    ("value", "unit", "up", "shown"),
    [
        # Rounded by hand.
        (0.1, "W", True, "100 mW"),
        (0.10001, "W", True, "101 mW"),
        (0.9999, "W", True, "1 W"),
        (12.0, "W", True, "12 W"),
        (1234.5, "W", True, "1.24 kW"),
        (4e-6, "J", True, "4 µJ"),
        (8e-9, "s", False, "8 ns"),
        (1.2399e-13, "s", False, "123 fs"),
        (80.123e6, "Hz", True, "80.2 MHz"),
        (1e-15, "W", True, "1 fW"),
    ],
)
def test_measures(value: float, unit: str, up: bool, shown: str) -> None:
    assert measure(exact(value), unit, ".", up=up).replace("\u00a0", " ") == shown


def test_distances_keep_to_metres_and_kilometres() -> None:
    assert measure(exact(99.74), "m", ".", prefixes="km") == "99.8\u00a0m"
    assert measure(exact(32311.8), "m", ",", prefixes="km") == "32,4\u00a0km"
    assert measure(exact(0.01234), "m", ".", prefixes="km") == "12.4\u00a0mm"
    assert measure(exact(2.5e7), "m", ".", prefixes="km") == "25000\u00a0km"


def test_densities_go_up_to_one_decimal() -> None:
    assert density(exact(2.0), ".") == "2"
    assert density(exact(2.001), ".") == "2.1"
    assert density(exact(5.9292), ",") == "6"


def test_wavelengths_stand_as_given() -> None:
    assert wavelength(532.0, ".") == "532\u00a0nm"
    assert wavelength(1064.13, ",") == "1064,13\u00a0nm"
    assert wavelength(10600.0, ".") == "10.6\u00a0µm"


def test_three_decimals_cannot_be_read_as_thousands() -> None:
    # '532,245' is half a million to one reader and half a thousand to another.
    assert number(Decimal("532.245"), ",") == "532,2450"
    assert number(Decimal("0.245"), ",") == "0,245"
    assert number(Decimal("1064.245"), ",") == "1064,245"


def value_of(shown: str) -> Decimal:
    """A printed measure as a number."""
    figure, _, unit = shown.partition("\u00a0")
    prefix = unit[:-1] if len(unit) > 1 else ""
    return Decimal(figure).scaleb(PREFIX[prefix])


@given(st.floats(1e-15, 1e12), st.booleans())
def test_a_printed_measure_never_errs_to_the_unsafe_side(value: float, up: bool) -> None:
    shown, true = value_of(measure(exact(value), "W", ".", up=up)), exact(value)
    unit = Decimal(1).scaleb(true.adjusted() - 2)
    assert 0 <= (shown - true if up else true - shown) < unit


@given(st.floats(0, 20))
def test_a_printed_density_is_never_less(value: float) -> None:
    assert 0 <= Decimal(density(exact(value), ".")) - exact(value) <= Decimal("0.1")
