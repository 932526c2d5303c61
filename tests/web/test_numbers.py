"""Numbers as they are typed and as they are shown."""

from __future__ import annotations

from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.web.numbers import NotANumber, parse_number, plain, shown_down, shown_up
from tests.web.markup import one_unit, shown_value

#: Typed text and its only reading.
READINGS = {
    "532": 532.0,
    "532.": 532.0,
    ".5": 0.5,
    "0.5": 0.5,
    "0,5": 0.5,
    ",5": 0.5,
    "1064,5": 1064.5,
    "1,5": 1.5,
    "1,06": 1.06,
    "1,0640": 1.064,
    "0,532": 0.532,
    "01,064": 1.064,
    "1064,532": 1064.532,
    "1.064": 1.064,
    "1e-3": 1e-3,
    "1E-3": 1e-3,
    "1,5e-3": 1.5e-3,
    "1,064e3": 1064.0,
    "8e7": 8e7,
    "+3": 3.0,
    "-3": -3.0,
    "\u22123": -3.0,
    "  7 ": 7.0,
    "\u00a07": 7.0,
    "0": 0.0,
    "1e-400": 0.0,
}


@pytest.mark.parametrize(("typed", "value"), READINGS.items())
def test_one_reading(typed: str, value: float) -> None:
    assert parse_number(typed) == value


@pytest.mark.parametrize("typed", ["1,064", "10,600", "999,999", "-1,064", "+1,000"])
def test_two_readings_are_both_shown(typed: str) -> None:
    """A thousand or a decimal comma: 1,064 is 1.064 or 1064."""
    with pytest.raises(NotANumber) as refused:
        parse_number(typed)
    message = str(refused.value) + refused.value.remedy
    assert typed.replace(",", ".") in message
    assert typed.replace(",", "") in message


GROUPED = (
    "1,064,000",
    "1.064.000",
    "10 600",
    "10\u00a0600",
    "10\u202f600",
    "10'600",
    "1,064.5",
    "1.064,5",
    "1 064,5",
)


@pytest.mark.parametrize("typed", GROUPED)
def test_groups_are_refused(typed: str) -> None:
    with pytest.raises(NotANumber, match="grouped") as refused:
        parse_number(typed)
    assert "without separators" in refused.value.remedy


WORDS = (
    "",
    " ",
    "green",
    "532nm",
    "532 nm",
    "1e",
    "e3",
    "1e3.5",
    "1.2.3",
    "1,2,3",
    "--1",
    "+-1",
    "0x1f",
    "1_000",
)
MORE = ("nan", "NaN", "inf", "Infinity", "-inf", "½", "1/2", "10^3", "1×10³", ".", ",", "+", "1;2", "5%")


@pytest.mark.parametrize("typed", [*WORDS, *MORE])
def test_other_text_is_refused(typed: str) -> None:
    with pytest.raises(NotANumber) as refused:
        parse_number(typed)
    assert refused.value.remedy


@pytest.mark.parametrize("typed", ["1e400", "-1e400"])
def test_too_large_is_refused(typed: str) -> None:
    with pytest.raises(NotANumber, match="too large"):
        parse_number(typed)


def test_too_long_is_refused() -> None:
    with pytest.raises(NotANumber, match="too long"):
        parse_number("0." + "1" * 40)


#: Digits of other scripts: read by their value or refused, never as something else.
@pytest.mark.parametrize("typed", ["٣", "１２", "१२.५"])
def test_other_digits_keep_their_value(typed: str) -> None:
    try:
        value = parse_number(typed)
    except NotANumber:
        return
    assert value == float(typed)


FINITE = st.floats(allow_nan=False, allow_infinity=False)
POSITIVE = st.floats(min_value=0, allow_infinity=False, allow_nan=False)


@given(FINITE)
def test_plain_is_exact(value: float) -> None:
    """What is written back into the form is read as the same number."""
    text = plain(value)
    assert float(text) == value
    if len(text) <= 40:
        assert parse_number(text) == value


@given(FINITE)
def test_plain_is_settled(value: float) -> None:
    assert plain(float(plain(value))) == plain(value)


@pytest.mark.parametrize(("value", "text"), [(532.0, "532"), (0.1, "0.1"), (1e-8, "1e-08"), (-2.5, "-2.5")])
def test_plain_is_short(value: float, text: str) -> None:
    assert plain(value) == text


@given(POSITIVE, st.integers(min_value=1, max_value=8))
def test_shown_up_is_never_below(value: float, digits: int) -> None:
    exact, shown = Decimal(repr(value)), shown_value(shown_up(value, digits))
    assert shown >= exact
    assert exact == 0 or shown - exact < one_unit(exact, digits)


@given(POSITIVE, st.integers(min_value=1, max_value=8))
def test_shown_down_is_never_above(value: float, digits: int) -> None:
    exact, shown = Decimal(repr(value)), shown_value(shown_down(value, digits))
    assert shown <= exact
    assert exact == 0 or exact - shown < one_unit(exact, digits)


@given(st.integers(min_value=0, max_value=999), st.integers(min_value=-12, max_value=12))
def test_three_digits_are_shown_as_they_are(number: int, exponent: int) -> None:
    value = float(f"{number}e{exponent}")
    assert shown_value(shown_up(value)) == shown_value(shown_down(value)) == Decimal(repr(value))


#: By hand: value, rounded up and down to three digits.
SHOWN = [
    (0.0, "0", "0"),
    (1.0, "1", "1"),
    (99.751863, "99.8", "99.7"),
    (102.0767, "103", "102"),
    (6.363961, "6.37", "6.36"),
    (2.008927, "2.01", "2.00"),
    (0.0999, "0.0999", "0.0999"),
    (0.09991, "0.100", "0.0999"),
    (999.1, "1000", "999"),
    (123456.0, "124000", "123000"),
    (999999.0, "1.00 × 10⁶", "999000"),
    (1.5e7, "1.50 × 10⁷", "1.50 × 10⁷"),
    (1.2345e-9, "1.24 × 10⁻⁹", "1.23 × 10⁻⁹"),
]


@pytest.mark.parametrize(("value", "up", "down"), SHOWN)
def test_shown_by_hand(value: float, up: str, down: str) -> None:
    assert (shown_up(value), shown_down(value)) == (up, down)
