"""Pairs of eyewear against lasers: what is covered, how strongly, and what is told."""

from __future__ import annotations

import math
from typing import Any

import pytest

from service.contract.protection import PairCheck
from tests.assess.needs import cw, line, pair, protection, pulse, train, verdicts

#: Diode-pumped, frequency-doubled: three lines from one housing.
THREE = (line(808, cw(2)), line(1064, cw(1)), line(532, cw(0.1)))
NEAR_IR = pair("near infrared", (780, 1100, 7, "D LB7"), light=0.6)
WITHOUT_PUMP = pair("green and 1064", (515, 540, 6, "D LB6"), (1000, 1100, 7, "D LB7"), light=0.3)
ALL = pair("everything", (515, 540, 6, "D LB6"), (780, 1100, 7, "D LB7"), light=0.25)
#: 0.1 W at 532 nm for 0.25 s through 7 mm: 2598.4 / 25.456 W/m2 = 102.1, as in the contract's example.
RATIO = 0.1 / (math.pi / 4 * 0.007**2) / (18 * 0.25**0.75 / 0.25)
GREEN = line(532, cw(0.1))


def one(made: dict[str, Any], *lines: dict[str, Any], **more: Any) -> PairCheck:
    (found,) = verdicts([made], *lines, **more)
    return found


@pytest.mark.parametrize(("made", "open_nm"), [(NEAR_IR, 532), (WITHOUT_PUMP, 808)])
def test_the_open_line_of_three_is_named(made: dict[str, Any], open_nm: int) -> None:
    found = one(made, *THREE)
    assert not found.sufficient
    for check in found.lines:
        if check.wavelength_nm == open_nm:
            assert (check.covered, check.enough, check.optical_density) == (False, False, None)
            assert check.modes == []
            assert any(f"{open_nm} nm" in text and "not covered" in text for text in check.missing)
            assert check.remaining_ratio > 1
        else:
            assert (check.covered, check.enough, check.missing) == (True, True, [])
            assert check.remaining_ratio < 1
    assert found.remaining_ratio >= max(c.remaining_ratio for c in found.lines)


def test_a_pair_for_all_three_is_sufficient() -> None:
    found = one(ALL, *THREE)
    assert found.sufficient
    assert [c.enough for c in found.lines] == [True, True, True]
    assert found.warnings == []


def test_density_by_hand() -> None:
    """OD = log10(102.1) = 2.009; OD 2 leaves 1.021 times the limit, OD 3 a tenth of a tenth less."""
    for density, enough in ((2.0, False), (2.01, True), (3.0, True)):
        found = one(pair("p", (500, 560, density, None)), GREEN)
        (check,) = found.lines
        assert check.optical_density_needed == pytest.approx(math.log10(RATIO), rel=1e-9)
        assert check.optical_density_needed == pytest.approx(2.009, abs=5e-4)
        assert check.remaining_ratio == pytest.approx(RATIO * 10**-density, rel=1e-9)
        assert (check.enough, found.dense_enough) == (enough, enough)
        # 63 662 W/m2 ask for a scale number; a density alone does not show that the filter lasts.
        assert (found.resistance_shown, found.sufficient) == (False, False)
    short = one(pair("p", (500, 560, 1.5, None)), GREEN).lines[0].missing
    # 2.009 - 1.5 = 0.509, told rounded up
    assert len(short) == 1
    assert all(part in short[0] for part in ("1.5", "2.01", "0.51"))


def test_a_density_alone_is_warned_of() -> None:
    alone = one(pair("p", (500, 560, 5, None)), GREEN)
    marked = one(pair("p", (500, 560, 5, "D LB5")), GREEN)
    assert (alone.dense_enough, alone.resistance_shown, alone.sufficient) == (True, False, False)
    assert marked.sufficient
    assert any("optical density alone" in w for w in alone.warnings)
    assert not any("optical density alone" in w for w in marked.warnings)


def test_a_density_whose_mark_is_for_other_wavelengths_is_alone_too() -> None:
    """The mark is for 1064 nm: at 532 nm nothing says that the filter withstands the beam."""
    found = one(pair("p", (500, 1100, 7, "1064 D LB7")), GREEN)
    assert found.lines[0].modes == []
    assert any("optical density alone" in w for w in found.warnings)


@pytest.mark.parametrize("number", range(1, 11))
def test_a_mark_alone_counts_as_its_density(number: int) -> None:
    """LBn lets at most 10^-n through; the beam of 63 662 W/m2, with its size factor, needs LB5."""
    found = one(pair("p", (500, 560, None, f"D LB{number}")), GREEN)
    (check,) = found.lines
    assert check.optical_density == number
    assert check.remaining_ratio == pytest.approx(RATIO * 10.0**-number, rel=1e-9)
    (mode,) = check.modes
    assert (mode.mode, mode.needed, mode.marked, mode.enough) == ("D", 5, number, number >= 5)
    assert found.sufficient == (number >= 5)


def test_density_does_not_stand_in_for_a_mark() -> None:
    found = one(pair("p", (500, 560, 10, "D LB4")), GREEN)
    assert not found.sufficient
    (text,) = found.lines[0].missing
    assert all(part in text for part in ("mode D", "LB4", "LB5"))


def test_every_mode_must_be_marked() -> None:
    """9 mJ, 8 ns, 20 Hz on 5 mm at 1064 nm: R LB6 and D LB5 (worked with the scale numbers)."""
    laser = line(1064, train(9e-3, 8e-9, 20), profile="tophat", diameter_mm=5)
    marks = {
        "D LB5 + IR LB6": (True, []),
        "DIR LB6": (True, []),
        "DR LB6": (True, []),
        "D LB5 + IR LB5": (False, ["mode R"]),
        "D LB4 + IR LB6": (False, ["mode D"]),
        "D LB6": (False, ["mode R"]),
        "IR LB6": (False, ["mode D"]),
        "D LB6 + I LB6": (False, ["mode R"]),
        "D LB1 + R LB1": (False, ["mode R", "mode D"]),
    }
    found = verdicts([pair(m, (1000, 1100, 9, m)) for m in marks], laser)
    for check, (enough, missing) in zip(found, marks.values(), strict=True):
        texts = check.lines[0].missing
        assert check.sufficient == enough, check.name
        assert len(texts) == len(missing), check.name
        assert all(text.startswith(mode) for text, mode in zip(texts, missing, strict=True)), check.name


def test_beyond_the_scale_is_told() -> None:
    """1 J in 100 fs at 800 nm on 0.1 mm: 1.27e8 J/m2; LB10 ends at 1.5e6."""
    laser = line(800, pulse(1, 1e-13), diameter_mm=0.1, profile="tophat")
    found = one(pair("p", (780, 820, 20, "DIRM LB10")), laser)
    assert not found.sufficient
    assert any("beyond LB10" in text for text in found.lines[0].missing)


def test_marks_narrow_the_range() -> None:
    made = pair("p", (400, 1100, None, "515-540 D LB6 + 1000-1100 D LB7"))
    assert one(made, GREEN).sufficient
    found = one(made, line(633, cw(0.1)))
    assert not found.sufficient
    assert not found.lines[0].covered


@pytest.mark.parametrize(("low", "high"), [(532, 532), (532, 600), (400, 532)])
def test_both_ends_of_a_range_belong_to_it(low: float, high: float) -> None:
    assert one(pair("p", (low, high, 6, "D LB6")), GREEN).sufficient


@pytest.mark.parametrize(("low", "high"), [(400, 531.9), (532.1, 700)])
def test_beside_a_range_nothing_is_covered(low: float, high: float) -> None:
    found = one(pair("p", (low, high, 6, "D LB6")), GREEN)
    assert not found.sufficient
    assert "532 nm is not covered" in found.lines[0].missing[0]


def test_lines_add_behind_the_filter() -> None:
    """Two green lines of 102.1 each, OD 2.1: 0.811 times the limit each, 1.622 together."""
    lines = (line(532, cw(0.1)), line(520, cw(0.1)))
    found = one(pair("p", (500, 560, 2.1, None)), *lines)
    for check in found.lines:
        assert check.enough
        assert check.remaining_ratio == pytest.approx(RATIO * 10**-2.1, rel=1e-9)
    assert found.remaining_ratio == pytest.approx(2 * RATIO * 10**-2.1, rel=1e-9)
    assert found.remaining_ratio == pytest.approx(1.622, abs=5e-4)
    assert not found.sufficient
    assert any("together" in w for w in found.warnings)
    enough = one(pair("p", (500, 560, 2.4, None)), *lines)
    assert enough.dense_enough
    assert not any("together" in w for w in enough.warnings)


def test_lines_that_do_not_add_are_not_added() -> None:
    """Retina and cornea: 532 nm and 10.6 um, both barely covered, are each within their limit."""
    lines = (line(532, cw(0.1)), line(10600, cw(1)))
    densities = [n.worst_place.optical_density for n in protection(*lines).lines]
    made = pair("p", (500, 560, densities[0] + 0.05, None), (10000, 11000, densities[1] + 0.05, None))
    found = one(made, *lines)
    assert found.dense_enough
    assert found.remaining_ratio == pytest.approx(10**-0.05, rel=1e-6)


def test_a_pair_must_do_wherever_each_line_is_narrowest() -> None:
    """Green from the exit on, infrared focused 10 m ahead: OD 1 at 1064 nm is far too little there.

    1 W within 7 mm is 25 984 W/m2; ICNIRP 2013 allows 10 C_A C_C = 50 W/m2 for 100 s at 1064 nm: at the
    focus about 520 times the limit.
    """
    green = line(532, cw(1), diameter_mm=1, divergence_mrad=10)
    focused = line(1064, cw(1), diameter_mm=0.1, divergence_mrad=10, waist_m=10)
    made = pair("p", (500, 560, 7, None), (1000, 1100, 1, None))
    assert not one(made, focused).sufficient
    assert not one(made, green, focused).sufficient


def test_a_line_within_its_limit_needs_no_cover() -> None:
    found = one(pair("p", (1000, 1100, 7, "D LB7")), line(1064, cw(1)), line(532, cw(1e-5)))
    assert found.sufficient
    assert [(c.covered, c.enough) for c in found.lines] == [(True, True), (False, True)]


ALIGNMENT = {
    "weak": (line(532, cw(2e-3)), pair("p", (500, 560, None, "RB1"))),
    "strong number": (line(532, cw(5e-3)), pair("p", (500, 560, None, "RB5"))),
    "harmless laser": (line(532, cw(1e-6)), pair("p", (500, 560, None, "RB1"))),
    "with a density": (line(532, cw(5e-3)), pair("p", (500, 560, 8, "RB2"))),
    "beside a full range": (
        line(532, cw(5e-3)),
        pair("p", (500, 560, 8, "D LB6"), (600, 650, None, "RB2")),
    ),
}


@pytest.mark.parametrize(("laser", "made"), ALIGNMENT.values(), ids=ALIGNMENT.keys())
def test_alignment_pairs_are_never_sufficient(laser: dict[str, Any], made: dict[str, Any]) -> None:
    found = one(made, laser, viewing={"distance_m": 1000})
    assert found.alignment_only
    assert not found.sufficient
    assert not found.sufficient_at_distance
    assert any("lignment" in w for w in found.warnings)


@pytest.mark.parametrize(
    ("laser", "mark", "told"),
    [
        # 5 mW is RB1 (to 10 mW), 0.1 W is RB2, 200 W beyond RB5 (from memory); 1064 nm is no visible line.
        (line(532, cw(5e-3)), "RB1", "RB1 only, which lets the beam through; enough for aligning"),
        (line(532, cw(0.1)), "RB2", "enough for aligning"),
        (line(532, cw(0.1)), "RB1", "aligning asks for RB2"),
        (line(532, cw(200)), "RB5", "beyond RB5"),
        (line(1064, cw(0.1)), "RB5", "not meant for this line"),
    ],
)
def test_alignment_pairs_say_what_they_are_good_for(laser: dict[str, Any], mark: str, told: str) -> None:
    (check,) = one(pair("p", (500, 1100, None, mark)), laser).lines
    assert not check.enough
    assert any(told in text for text in check.missing)


@pytest.mark.parametrize(
    ("light", "dark"), [(0.01, True), (0.199, True), (0.2, False), (0.9, False), (None, False)]
)
def test_dark_pairs_are_warned_of(light: float | None, dark: bool) -> None:
    """Below 20 % the room looks dark (common practice)."""
    found = one(pair("p", (500, 560, 6, "D LB6"), light=light), GREEN)
    assert found.sufficient
    assert found.luminous_transmittance == light
    assert any("Luminous transmittance" in w and "below 20 %" in w for w in found.warnings) == dark


def test_the_mark_y_is_warned_of() -> None:
    for marking, warned in (("D LB6 Y", True), ("D LB6 + IR LB5 Y", True), ("D LB6", False)):
        found = one(pair("p", (500, 560, 6, marking)), GREEN)
        assert found.sufficient
        assert any("Marked Y" in w and "repetition" in w for w in found.warnings) == warned


def test_numbers_of_screens_do_not_cover_eyes() -> None:
    found = one(pair("p", (500, 560, None, "D AB8")), GREEN)
    assert not found.sufficient
    assert not found.lines[0].covered
    assert any("screens" in w for w in found.warnings)


def test_sufficient_pairs_come_first_then_the_lightest() -> None:
    marks = {
        "dark": ("D LB6", 0.1),
        "open": (None, 0.99),
        "light": ("D LB6", 0.5),
        "unknown": ("D LB6", None),
        "weak": ("D LB1", 0.6),
        "same": ("D LB6", 0.5),
    }
    made = [
        pair(name, (500, 560, None, mark), light=light)
        if mark
        else pair(name, (1000, 1100, 7, None), light=light)
        for name, (mark, light) in marks.items()
    ]
    found = verdicts(made, GREEN)
    assert [p.name for p in found] == list(marks)
    ranking = [p.name for p in sorted(found, key=lambda p: p.rank)]
    assert ranking == ["light", "same", "dark", "unknown", "open", "weak"]
    assert sorted(p.rank for p in found) == [1, 2, 3, 4, 5, 6]


def test_at_a_distance_a_weaker_pair_will_do() -> None:
    """At 1 km 0.1 W has spread to a metre: nothing is needed there, OD 2 is too little at the exit."""
    found = one(pair("p", (500, 560, None, "D LB1")), GREEN, viewing={"distance_m": 1000})
    assert (found.sufficient, found.sufficient_at_distance) == (False, True)
    assert one(pair("p", (500, 560, 1, None)), GREEN).sufficient_at_distance is None


def test_needs_at_both_places() -> None:
    found = protection(GREEN, viewing={"distance_m": 10}).lines[0]
    assert found.at_distance is not None
    assert (found.worst_place.distance_m, found.at_distance.distance_m) == (0.0, 10.0)
    assert found.worst_place.scale_number == 5
    # worked with the scale numbers: LB4 with the size factor; the ratio still needs OD 1.9, so LB4
    assert found.at_distance.scale_number == 4
    for place in (found.worst_place, found.at_distance):
        assert place.transmittance == pytest.approx(1 / place.hazard_ratio, rel=1e-9)
        assert place.optical_density == pytest.approx(math.log10(place.hazard_ratio), rel=1e-9)


def test_the_scale_table_is_weaker_than_the_newer_limits() -> None:
    """Green giant pulses: the table rests on 5e-3 J/m2, ICNIRP 2013 allows 2e-3, through 7 mm.

    2e-6 J on 7 mm (3.8485e-5 m2) is 0.051969 J/m2: LB2 (0.5); 0.051969 / 2e-3 = 26.0, OD 1.415, LB2. With
    1e-5 J: 0.25984 J/m2 still LB2, but OD 2.114 needs LB3.
    """
    beam: dict[str, Any] = {"profile": "tophat", "diameter_mm": 7}
    for energy, table, number, weak in ((2e-6, 2, 2, False), (1e-5, 2, 3, True)):
        place = protection(line(532, pulse(energy, 1e-8), **beam)).lines[0].worst_place
        assert place.scale_numbers[0].scale_number == table
        assert (place.scale_number, place.scale_table_too_weak) == (number, weak)


def test_what_is_from_memory_says_so() -> None:
    wide = protection(line(1064, cw(1)))
    assert any("from memory" in r and "1.7" in r for r in wide.remarks)
    grouped = protection(line(1064, train(1e-6, 1e-8, 1e6)))
    assert any("grouping" in r and "memory" in r for r in grouped.remarks)
    plain = protection(line(266, cw(1)))
    assert plain.remarks == []
    for place in (wide.lines[0].worst_place, grouped.lines[0].worst_place):
        assert all("EN 207" in s.source for s in place.scale_numbers)
        # the size factor of the wide beam and the grouping time are remembered
        assert {s.known for s in place.scale_numbers} == {"memory"}
    narrow = protection(line(1064, cw(1), diameter_mm=0.5)).lines[0].worst_place
    assert [s.known for s in narrow.scale_numbers] == ["read"]
