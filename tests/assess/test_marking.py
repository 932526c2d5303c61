"""Markings in the standards' notation: what is read, and why the rest is refused."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.assess.marking import Mark, MarkingError, parse_marking


def lb(number: int, modes: str, low: float | None = None, high: float | None = None, y: bool = False) -> Mark:
    return Mark("LB", number, modes, y, low, high)


#: Written ">315": the range does not hold 315 nm itself.
ABOVE_315 = math.nextafter(315, math.inf)

GOOD = {
    "D LB5": [lb(5, "D")],
    "DIR LB6": [lb(6, "DIR")],
    "DIRM LB10": [lb(10, "DIRM")],
    "M LB1": [lb(1, "M")],
    "RI LB4": [lb(4, "RI")],
    "D LB5 + IR LB6": [lb(5, "D"), lb(6, "IR")],
    "D LB5+IR LB6": [lb(5, "D"), lb(6, "IR")],
    "  D   LB5  +  IR   LB6  ": [lb(5, "D"), lb(6, "IR")],
    "D LB 5": [lb(5, "D")],
    "D LB5 + IR LB6 Y": [lb(5, "D"), lb(6, "IR", y=True)],
    "D LB5Y": [lb(5, "D", y=True)],
    "DIR LB3 Y + M LB4": [lb(3, "DIR", y=True), lb(4, "M")],
    "1064 D LB5": [lb(5, "D", 1064, 1064)],
    "315-532 D LB5": [lb(5, "D", 315, 532)],
    "315 - 532 D LB5": [lb(5, "D", 315, 532)],
    "315\u2013532 D LB5": [lb(5, "D", 315, 532)],
    ">315-532 D LB5": [lb(5, "D", ABOVE_315, 532)],
    "> 315-532 D LB5": [lb(5, "D", ABOVE_315, 532)],
    "193,5-266,25 IR LB4": [lb(4, "IR", 193.5, 266.25)],
    "632.8 D LB2": [lb(2, "D", 632.8, 632.8)],
    "180-1000000 D LB1": [lb(1, "D", 180, 1e6)],
    # A part without a range takes that of the part before.
    "315-532 D LB5 + IR LB6": [lb(5, "D", 315, 532), lb(6, "IR", 315, 532)],
    "180-315 D LB6 + IR LB4 + >315-540 D LB5 + IR LB5": [
        lb(6, "D", 180, 315),
        lb(4, "IR", 180, 315),
        lb(5, "D", ABOVE_315, 540),
        lb(5, "IR", ABOVE_315, 540),
    ],
    "D LB5 + 1064 D LB6": [lb(5, "D"), lb(6, "D", 1064, 1064)],
    "RB1": [Mark("RB", 1, "", False, None, None)],
    "RB 5": [Mark("RB", 5, "", False, None, None)],
    "510-550 RB2": [Mark("RB", 2, "", False, 510, 550)],
    "D AB4": [Mark("AB", 4, "D", False, None, None)],
    "1064 D AB8 + IR AB9": [Mark("AB", 8, "D", False, 1064, 1064), Mark("AB", 9, "IR", False, 1064, 1064)],
}


@pytest.mark.parametrize(("text", "marks"), GOOD.items())
def test_good_markings(text: str, marks: list[Mark]) -> None:
    assert parse_marking(text) == marks


#: Malformed markings and words that the reason must hold.
BAD = {
    "": ["empty"],
    "   ": ["empty"],
    "\t\n": ["empty"],
    "D LB5 +": ["plus"],
    "+ D LB5": ["plus"],
    "D LB5 ++ IR LB6": ["plus"],
    "+": ["plus"],
    "D L5": ["older edition", "LB1 to LB10"],
    "DIR L 6": ["older edition"],
    "D": ["no scale number"],
    "1064": ["no scale number"],
    "315-532": ["no scale number"],
    "OD 7": ["no scale number"],
    "D 5": ["no scale number"],
    "D LB": ["no scale number"],
    "D LBx": ["no scale number"],
    "D OD5": ["no scale number"],
    "goggles": ["no scale number", "LB1 to LB10"],
    "LB5": ["modes", "LB5"],
    "DLB5": ["modes", "blank"],
    "5 LB": ["180"],
    "D LB5 CE": ["maker's marks"],
    "D LB5 XX 0196 CE": ["maker's marks"],
    "D LB5 DIN": ["maker's marks"],
    "d LB5": ["modes"],
    "D LB5.5": ["modes"],
    "D LB-5": ["no scale number"],
    "D, LB5": ["modes"],
    "D LB5, IR LB6": ["maker's marks"],
    "D LB5; IR LB6": ["maker's marks"],
    "X LB5": ["X", "no mode", "D, I, R and M"],
    "DIX LB5": ["X", "no mode"],
    "DD LB5": ["twice", "DD"],
    "DIRI LB5": ["twice", "DIRI"],
    "D LB5 + D LB6": ["mode D", "twice"],
    "DIR LB5 + R LB6": ["mode R", "twice"],
    "1064 D LB5 + D LB5": ["mode D", "twice"],
    "D LB0": ["LB0", "LB1 to LB10"],
    "D LB\u0665": ["LB1 to LB10"],
    ">315 D LB5": [">315", "no end"],
    "D LB11": ["LB11", "LB1 to LB10"],
    "D LB100": ["LB100"],
    "D AB11": ["AB11", "AB1 to AB10"],
    "RB0": ["RB1 to RB5"],
    "RB6": ["RB6", "RB1 to RB5"],
    "D RB2": ["modes"],
    "RB2 Y": ["maker's marks"],
    "532-315 D LB5": ["532-315", "low to high"],
    "100-532 D LB5": ["100-532", "180"],
    "0 D LB5": ["180"],
    "315-2000000 D LB5": ["1 000 000"],
    "1.064 D LB5": ["1.064", "nanometres"],
    "-532 D LB5": ["modes"],
    "315- D LB5": ["modes"],
    "315-532-1064 D LB5": ["modes"],
    "315-532nm D LB5": ["modes"],
    "1e3 D LB5": ["modes"],
    "NaN-532 D LB5": ["modes"],
}


@pytest.mark.parametrize(("text", "told"), BAD.items())
def test_malformed_markings_say_why(text: str, told: list[str]) -> None:
    with pytest.raises(MarkingError) as refused:
        parse_marking(text)
    for part in told:
        assert part in str(refused.value)


def test_there_are_enough_malformed_ones() -> None:
    assert len(BAD) >= 25


modes = st.permutations("DIRM").flatmap(lambda p: st.integers(1, 4).map(lambda n: "".join(p[:n])))


@given(modes, st.integers(1, 10), st.booleans(), st.integers(180, 1_000_000), st.integers(0, 1000))
def test_a_written_mark_is_read_back(letters: str, number: int, y: bool, low: int, width: int) -> None:
    high = min(low + width, 1_000_000)
    text = f"{low}-{high} {letters} LB{number}{' Y' if y else ''}"
    assert parse_marking(text) == [lb(number, letters, low, high, y)]


@given(st.text(alphabet="DIRMLBAY0123456789 +->.,XlR\u2013", max_size=40))
def test_any_text_is_read_or_refused_with_a_reason(text: str) -> None:
    reason = ""
    marks: list[Mark] = []
    try:
        marks = parse_marking(text)
    except MarkingError as error:
        reason = str(error)
    assert bool(marks) != bool(reason.strip())
    for mark in marks:
        assert 1 <= mark.number <= (5 if mark.scale == "RB" else 10)
        assert set(mark.modes) <= set("DIRM")
