"""What must never pass as protection: wrong mode, wrong place, no proof of resistance, a shared edge."""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.assess.needs import aligning, cw, line, needs, pair, protection, pulse, train, verdicts

#: 1 uJ in 10 ns at 1064 nm in 2 mm (1/e2): 1e-6 J / 1.5708e-6 m2 = 0.637 J/m2, above 0.5: R LB3.
SHOT = line(1064, pulse(1e-6, 1e-8))


@pytest.mark.parametrize(
    ("pulse_s", "mode"),
    [(1e-13, "M"), (9.9e-10, "M"), (1e-9, "R"), (1e-6, "R"), (1.1e-6, "I"), (0.25, "I"), (0.26, "D")],
)
def test_the_mode_follows_the_pulse(pulse_s: float, mode: str) -> None:
    """DGUV Information 203-042, Tabelle 2: M below 1 ns, R to 1 us, I to 0.25 s, D beyond."""
    assert [s.mode for s in needs(line(1064, pulse(1e-6, pulse_s)))] == [mode]


def test_a_pair_for_continuous_beams_does_not_stop_pulses() -> None:
    for marking, enough in (("D LB9", False), ("D LB9 + R LB2", False), ("D LB1 + R LB5", True)):
        (found,) = verdicts([pair("p", (1000, 1100, 9, marking))], SHOT)
        assert found.sufficient is enough, marking


def test_one_pulse_at_the_end_of_a_mode_needs_no_less_than_just_before_it() -> None:
    """1 J in 0.25 s counts as a pulse: 1 / 1.5708e-6 m2 = 636 620 J/m2, LB9; not 2.5e6 W/m2, LB6."""
    for pulse_s in (0.2499, 0.25):
        (need,) = needs(line(1064, pulse(1, pulse_s)))
        assert (need.mode, need.number) == ("I", 9)


def test_the_mark_of_one_mode_does_not_vouch_for_another() -> None:
    """1 uJ, 10 ns, 532 nm in 8 mm: H = 0.0398 J/m2, R LB1 by the table; the limits ask for more.

    Within 7 mm 1 - exp(-2 x 49/64) = 0.784: 0.0204 J/m2 against 2e-3 J/m2 (ICNIRP 2013), lg 10.2 = 1.008.
    """
    laser = line(532, pulse(1e-6, 1e-8), diameter_mm=8, divergence_mrad=0.5)
    place = protection(laser).lines[0].worst_place
    assert place.optical_density == pytest.approx(1.008, abs=2e-3)
    assert (place.scale_numbers[0].scale_number, place.scale_number) == (1, 2)
    assert place.scale_table_too_weak
    for marking, enough in (("D LB7 + R LB1", False), ("D LB7 + R LB2", True)):
        for density in (None, 7):
            (found,) = verdicts([pair("p", (500, 560, density, marking))], laser)
            assert found.sufficient is enough, marking


def test_every_line_is_judged_where_it_is_narrowest() -> None:
    """Carbon dioxide, 20 W, focused 2 m ahead to 2 mm: there 20 W / 9.62e-6 m2 (3.5 mm) x 0.998.

    2.07e6 W/m2 against 1000 W/m2: OD 3.3 (ICNIRP 2013, longer than 10 s); OD 1 is far too little.
    """
    green = line(532, cw(5), divergence_mrad=10)
    infrared = line(10600, cw(20), divergence_mrad=40, waist_m=2)
    made = pair("p", (500, 600, 7, "D LB8"), (9000, 11000, None, "D LB9"))
    weak = pair("q", (500, 600, 7, "D LB8"), (9000, 11000, 1, None))
    sure, found = verdicts([made, weak], green, infrared)
    assert not found.dense_enough
    assert found.lines[1].optical_density_needed == pytest.approx(3.31, abs=0.02)
    assert sure.sufficient


def test_a_window_ahead_of_a_focus_is_judged_behind_it() -> None:
    """1 W, 0.2 mm waist 2 m ahead: wholly within 7 mm, 1020.7 times the limit (25.456 W/m2)."""
    laser = line(532, cw(1), diameter_mm=0.2, divergence_mrad=5, waist_m=2)
    wall = {"name": "w", "distance_m": 0.5, "optical_density": 3.0}
    (found,) = protection(laser, windows=[wall]).windows
    ratio = 1 / (math.pi / 4 * 0.007**2) / (18 * 0.25**0.75 / 0.25)
    assert found.hazard_ratio == pytest.approx(ratio, rel=1e-9)
    assert found.sufficient is False


@pytest.mark.parametrize(
    "ranges",
    [
        [(500, 1100, 9, None)],
        [(500, 1100, 9, "500-540 D LB6")],
        [(500, 1100, 9, "D AB2")],
    ],
    ids=["density alone", "mark elsewhere", "mark of a screen"],
)
def test_density_without_a_mark_shows_no_resistance(ranges: list[tuple[Any, ...]]) -> None:
    """2 kW at 1070 nm in 5 mm: every place burns; dense enough is not strong enough."""
    laser = line(1070, cw(2000), diameter_mm=5)
    (found,) = verdicts([pair("p", *ranges)], laser)
    assert (found.dense_enough, found.resistance_shown, found.sufficient) == (True, False, False)
    assert any("withstand" in w for w in found.warnings)


def test_pairs_without_proof_of_resistance_rank_behind_those_with() -> None:
    made = [
        pair("light, density alone", (500, 560, 9, None), light=0.9),
        pair("dark, marked", (500, 560, 9, "D LB9"), light=0.1),
        pair("weak", (500, 560, 0.1, None), light=0.99),
    ]
    assert [p.rank for p in verdicts(made, line(532, cw(0.1)))] == [2, 1, 3]


def test_a_fast_train_is_aligned_by_its_average_power() -> None:
    """1 nJ at 100 MHz is 0.1 W: RB2 (to 0.1 W), although one pulse is far below 2e-7 J (from memory)."""
    need = aligning(line(532, train(1e-9, 1e-9, 1e8), diameter_mm=1))
    assert need is not None
    assert (need.unit, need.number) == ("W", 2)
    assert need.value == pytest.approx(0.1, rel=1e-6)


def test_alignment_eyewear_tells_what_remains() -> None:
    """0.19 uJ, 10 ns: no number is asked for, yet 1.9e-7 J / 7.7e-8 J = 2.5 times the limit of 2013."""
    found = protection(line(532, pulse(1.9e-7, 1e-8), diameter_mm=1))
    alignment = found.lines[0].worst_place.alignment
    assert alignment is not None
    assert alignment.scale_number == 0
    assert alignment.remaining_ratio == pytest.approx(1.9e-7 / (2e-3 * math.pi / 4 * 0.007**2), rel=1e-6)
    assert any("EN 208" in r and "2.47" in r for r in found.remarks)


def test_where_ranges_meet_or_overlap_the_weaker_counts() -> None:
    made = pair("p", (190, 534, 7, "D LB7"), (534, 570, 1, "D LB1"))
    for wavelength, density in ((533.9, 7), (534, 1), (534.1, 1)):
        (found,) = verdicts([made], line(wavelength, cw(0.1)))
        assert found.lines[0].optical_density == density
        assert any("weaker" in w for w in found.warnings) is (wavelength == 534)


def test_a_range_above_a_wavelength_does_not_hold_it() -> None:
    made = pair("p", (180, 400, None, ">315-400 D LB8"))
    for wavelength, covered in ((315, False), (315.1, True)):
        (found,) = verdicts([made], line(wavelength, cw(1e-3)))
        assert found.lines[0].covered is covered


@pytest.mark.parametrize("power", [1.1e-3 * 1.17**k for k in range(60)])
def test_the_exact_density_is_enough(power: float) -> None:
    wall = {"name": "w", "distance_m": 0}
    needed = protection(line(532, cw(power)), windows=[wall])
    density = needed.lines[0].worst_place.optical_density
    assert density == needed.windows[0].optical_density_needed
    (found,) = verdicts([pair("p", (532, 532, density, None))], line(532, cw(power)))
    assert found.dense_enough
    (shut,) = protection(line(532, cw(power)), windows=[{**wall, "optical_density": density}]).windows
    assert shut.sufficient


def test_lines_that_load_one_filter_are_added() -> None:
    """7 W in 2 mm (1/e2): 4.456e6 W/m2 x 1.4142^1.7 = 8.03e6, LB6 (to 1e7); two of them LB7."""
    made = [pair("p", (1000, 1100, 9, f"D LB{n}")) for n in (6, 7)]
    assert [p.sufficient for p in verdicts(made, line(1060, cw(7)))] == [True, True]
    two = (line(1060, cw(7)), line(1070, cw(7)))
    assert [p.sufficient for p in verdicts(made, *two)] == [False, True]
    assert any("load the same filter" in r for r in protection(*two).remarks)
    assert not any("load the same filter" in r for r in protection(two[0]).remarks)


def test_pulses_that_load_one_filter_are_added() -> None:
    """3.5 mJ on a top hat of 1 mm: 4456 J/m2, R LB6 (to 5000); two together LB7."""
    shot = line(1064, pulse(3.5e-3, 1e-8), profile="tophat", diameter_mm=1, divergence_mrad=0)
    made = [pair("p", (1000, 1100, 9, f"R LB{n}")) for n in (6, 7)]
    assert [p.sufficient for p in verdicts(made, shot)] == [True, True]
    assert [p.sufficient for p in verdicts(made, shot, shot)] == [False, True]


def test_lines_harmless_alone_ask_for_proof_where_their_sum_does() -> None:
    """Sixteen times 0.15 W on 15 mm at 10.6 um: 13.6 times 1000 W/m2 together, each alone below it."""
    beam: dict[str, Any] = {"profile": "tophat", "diameter_mm": 15, "divergence_mrad": 0}
    lines = [line(10600, cw(0.15), **beam) for _ in range(16)]
    (found,) = verdicts([pair("p", (9000, 11000, 2, None))], *lines)
    assert (found.dense_enough, found.resistance_shown, found.sufficient) == (True, False, False)


@pytest.mark.parametrize("density", [0, 0.5, 3])
def test_a_weak_density_beside_a_pulse_mark_counts(density: float) -> None:
    """1 mJ, 10 ns at 1064 nm: 25.98 J/m2 through 7 mm against 0.02 J/m2, 1299 times, OD 3.11."""
    shot = line(1064, pulse(1e-3, 1e-8))
    (found,) = verdicts([pair("p", (1000, 1100, density, "R LB6"))], shot)
    assert not found.sufficient
    assert found.remaining_ratio == pytest.approx(0.998 * 1299 * 10**-density, rel=5e-3)


def test_an_oblong_beam_is_looked_at_farther_on() -> None:
    """7 W, 1 x 1 mm (1/e), 100 x 0 mrad: 8.91e6 W/m2, LB6 at the waist.

    0.13 m on 13 mm x 1 mm: 6.83e5 W/m2 x 13.04^1.7 = 5.4e7, LB7.
    """
    oblong = line(1064, cw(7), diameter_mm=[1, 1], divergence_mrad=[100, 0], level="1/e")
    made = [pair("p", (1000, 1100, 9, f"D LB{n}")) for n in (6, 7)]
    assert [p.sufficient for p in verdicts(made, oblong)] == [False, True]


def test_a_window_shields_skin_too() -> None:
    """100 W on 50 mm, source of 3 rad: skin 2.55e4 J/m2 in 0.25 s against 7.78e3 J/m2, 3.27 times."""
    wide = {**line(532, cw(100), diameter_mm=50), "subtense_mrad": 3000}
    (found,) = protection(wide, windows=[{"name": "w", "distance_m": 0, "optical_density": 0}]).windows
    assert found.hazard_ratio == pytest.approx(3.27, abs=0.03)
    assert found.sufficient is False


def test_a_pair_marked_y_is_not_shown_to_last_for_rare_pulses() -> None:
    """Y: not tested at 25 Hz and below (DGUV Information 203-042, A8.2)."""
    made = pair("p", (1000, 1100, 9, "DIR LB8 Y"))
    for emission, sufficient in (
        (pulse(1e-6, 1e-8), False),
        (train(1e-6, 1e-8, 25), False),
        (train(1e-6, 1e-8, 26), True),
        (cw(1), True),
    ):
        (found,) = verdicts([made], line(1064, emission))
        assert found.sufficient is sufficient
        assert found.dense_enough


def test_the_working_names_every_table() -> None:
    """9 mJ, 8 ns, 20 Hz in 5 mm (top hat): 458.37 J/m2 x 100^(1/4) = 1449.5 J/m2, R LB6 (to 5000)."""
    laser = line(1064, train(9e-3, 8e-9, 20), profile="tophat", diameter_mm=5)
    steps = {s.symbol: s for s in protection(laser).lines[0].worst_place.working}
    assert steps["A"].value == pytest.approx(1.9635e-5, rel=1e-4)
    assert steps["H_R"].value == pytest.approx(1449.5, abs=0.1)
    assert steps["LB_R"].value == 6
    assert steps["E_D"].value == pytest.approx(9167.3, abs=0.1)
    assert steps["F"].known == "memory"
    assert steps["LB_D"].value == 5
    assert all("EN 207" in steps[s].source for s in ("LB_R", "LB_D"))


def test_a_density_below_the_mark_beside_it_counts() -> None:
    """2 kW at 532 nm in 2 mm: OD 6.3 needed; LB10 promises more than the OD 3 stated in the same range."""
    (found,) = verdicts([pair("p", (500, 560, 3, "D LB10"))], line(532, cw(2000)))
    assert found.lines[0].optical_density == 3
    assert not found.dense_enough
    assert any("optical density 3" in text for text in found.lines[0].missing)
