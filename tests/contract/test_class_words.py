"""What the answer says of a class: whether it exists, holds or is exceeded, by how much and why.

Limits and conditions of IEC 60825-1:2014 and 21 CFR 1040.10, from memory.
"""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.contract.classification import margin_text
from tests.contract.printed import numbers_of
from tests.contract.test_classification import cw
from tests.rules.class_engine import IEC, US
from tests.web.client import Client

#: An emission that equals the limit but for rounding holds.
SLACK = 1e-12


@pytest.mark.parametrize(
    ("nm", "scheme", "limits"),
    [
        # Class 2 is for 400-700 nm, IIa, II and IIIa for 400-710 nm; no Class 3R below 302.5 nm here.
        (1550, IEC, "2"),
        (248, IEC, "2"),
        (248, IEC, "3R"),
        (905, US, "IIa"),
        (905, US, "II"),
        (905, US, "IIIa"),
        (400, US, "II"),
    ],
)
@pytest.mark.parametrize("power", [1e-12, 1e2])
def test_a_class_that_does_not_exist_neither_holds_nor_is_exceeded(
    client: Client, nm: float, scheme: str, limits: str, power: float
) -> None:
    answer = client.evaluate(cw(nm, power))
    (level,) = (
        x
        for c in answer["classification"]
        if c["scheme"] == scheme
        for x in c["levels"]
        if x["limits"] == limits
    )
    assert (level["available"], level["holds"]) == (False, False)
    assert level["margin"] == f"Class {limits} is not available at this wavelength"


def test_a_class_of_one_line_of_two_is_available(client: Client) -> None:
    """Class 2 exists for a laser with a visible line (4.3 b) and 5.3, from memory)."""
    body = cw(532, 1e-4)
    body["lines"] += cw(1064, 1e-4)["lines"]
    level = client.evaluate(body)["classification"][0]["levels"][1]
    assert (level["limits"], level["available"], level["holds"]) == ("2", True, True)


def test_class_1m_is_told_with_both_conditions(client: Client) -> None:
    """850 nm, 5 mW evenly over 40 mm and parallel: by hand, Class 1 being 0.39 mW x 10^0.3 (Table 3).

    (7/40)^2 of 5 mW enter the eye: 0.1531 / 0.7781 = 0.1968; all of it enters 50 mm: 6.426 times.
    """
    wide = cw(850, 5e-3, diameter_mm=40, divergence_mrad=0.001, profile="tophat")
    iec = client.evaluate(wide)["classification"][0]
    assert iec["hazard_class"] == "1M"
    level = iec["levels"][0]
    limit = 0.39 * 10**0.3
    assert level["ratios"] == pytest.approx({"1": 5 / limit, "3": 5 * (7 / 40) ** 2 / limit}, rel=1e-3)
    assert (
        level["margin"] == "Class 1: naked eye holds with 80 % left, with viewing optics exceeded 6.43 times"
    )
    assert iec["reason"] == (
        "naked eye within Class 1 (0.197 of the limit); with viewing optics exceeded 6.43 times but below "
        "Class 3B"
    )


@pytest.mark.parametrize(
    ("power", "reason"),
    [
        # 0.39 mW and 0.5 W at 633 nm (Tables 3 and 8)
        (0.39e-4, "the limits of Class 1 hold (0.1 of the limit)"),
        (0.6, "the limits of Class 3B are exceeded 1.20 times"),
    ],
)
def test_the_reason_of_other_classes(client: Client, power: float, reason: str) -> None:
    iec = client.evaluate(cw(633, power, profile="tophat"))["classification"][0]
    assert iec["reason"].replace("0.100", "0.1") == reason


def test_a_waist_beyond_the_distance_of_the_condition_is_told(client: Client) -> None:
    """A waist 1 m ahead lies beyond 0.1 m (Table 10): the emission is taken there."""
    iec = client.evaluate(cw(532, 1e-3, waist_m=1, diameter_mm=0.2, divergence_mrad=100))["classification"][0]
    places = [s["text"] for s in iec["working"] if s["symbol"] == "a" and s["text"].startswith("condition 3")]
    assert places
    for text in places:
        assert text.endswith(
            "aperture 7 mm at 1 m from the exit, the waist, which lies beyond the 0.1 m of the condition"
        )


def test_the_time_base_of_an_upper_end(client: Client) -> None:
    """21 CFR 1040.10: 400 nm has the limits and the time bases up to 400 nm, 710 nm those of the visible."""
    us = client.evaluate(cw(710, 1e-3))["classification"][1]
    found = {x["limits"]: x for x in us["levels"]}
    assert found["II"]["available"]
    times = [s["value"] for s in us["working"] if s["symbol"] == "T"]
    assert times == [3e4, 1e3, 0.25, 0.25, 10]
    us = client.evaluate(cw(400, 1e-3))["classification"][1]
    assert [s["value"] for s in us["working"] if s["symbol"] == "T"] == [3e4, 10]
    assert us["hazard_class"] == "IIIb"


@settings(max_examples=300, deadline=None, derandomize=True)
@given(st.floats(-12, 12).map(lambda x: 10.0**x))
def test_the_margin_rounds_to_the_safe_side(ratio: float) -> None:
    """Never fewer times than it is, never more left than there is; within one in a hundred."""
    text = margin_text("3R", {"3": ratio})
    (printed,) = numbers_of(text, "exceeded # times" if ratio > 1 + SLACK else "with # %")
    if ratio > 1 + SLACK:
        assert ratio * (1 - 2 * SLACK) <= printed <= ratio * 1.01 + 1e-12
    else:
        left = 100 * (1 - ratio)
        assert left - 1 - 1e-9 <= printed <= left + 100 * SLACK + 1e-9


@pytest.mark.parametrize(
    ("ratio", "words"),
    [
        (1.0, "holds with 0 % left"),
        # equal but for rounding
        (math.nextafter(1.0, 2), "holds with 0 % left"),
        (1.0 + 1e-9, "exceeded 1.01 times"),
        (100.00000000000001, "exceeded 100 times"),
        (0.9, "holds with 10 % left"),
        (4.191, "exceeded 4.20 times"),
        (1234.5, "exceeded 1240 times"),
        (0.375, "holds with 62 % left"),
        (0.995, "holds with 0 % left"),
        (0.0, "holds with 100 % left"),
    ],
)
def test_margins(ratio: float, words: str) -> None:
    assert margin_text("3B", {"3": ratio}).endswith(words)
