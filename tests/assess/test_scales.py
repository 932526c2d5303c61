"""Scale numbers that a line asks for, worked by hand from the printed tables."""

from __future__ import annotations

import math
from typing import Any

import pytest

from service.assess.scales import ScaleNeed
from tests.assess.needs import aligning, cw, line, needs, pulse, train
from tests.rules.printed_eyewear import BASIS, CELLS, MODES, WAVELENGTHS

#: A top hat of 0.1 mm and its area [m2]: too narrow for a size factor.
NARROW = {"profile": "tophat", "diameter_mm": 0.1, "divergence_mrad": 0}
NARROW_M2 = math.pi / 4 * 1e-8
#: A pulse duration [s] well inside each mode.
INSIDE = {"I": 1e-3, "R": 1e-8, "M": 1e-10}


def single(found: list[ScaleNeed]) -> ScaleNeed:
    (need,) = found
    return need


def of_value(mode: str, wavelength: float, value: float, quantity: str) -> ScaleNeed:
    """The need of a line whose irradiance [W/m2] or radiant exposure [J/m2] is the value."""
    if mode == "D":
        return single(needs(line(wavelength, cw(value * NARROW_M2), **NARROW)))
    seconds = INSIDE[mode]
    energy = value * NARROW_M2 * (seconds if quantity == "E" else 1.0)
    return single(needs(line(wavelength, pulse(energy, seconds), **NARROW)))


@pytest.mark.parametrize(("mode", "band", "number"), CELLS, ids=lambda x: str(x))
def test_value_on_a_bound_takes_its_number(mode: str, band: str, number: int) -> None:
    """On the bound LBn will do, a millionth above it the next; at every wavelength of the band."""
    printed = CELLS[mode, band, number]
    quantity = BASIS[mode][band][0]
    for letter in "IR" if mode == "I" else mode:
        for wavelength in WAVELENGTHS[band]:
            on = of_value(letter, wavelength, printed, quantity)
            assert (on.mode, on.number, on.wide) == (letter, number, number)
            assert on.value == pytest.approx(printed, rel=1e-12)
            above = of_value(letter, wavelength, printed * (1 + 1e-6), quantity)
            assert above.number == above.wide == number + 1


@pytest.mark.parametrize("mode", "DIRM")
@pytest.mark.parametrize("band", WAVELENGTHS)
def test_no_number_is_needed_up_to_the_limit_behind_the_scale(mode: str, band: str) -> None:
    quantity, limit = BASIS[mode][band]
    wavelength = WAVELENGTHS[band][1]
    for share, number in ((1e-2, 0), (1.0, 0), (1 + 1e-6, 1)):
        assert of_value(mode, wavelength, limit * share, quantity).number == number


@pytest.mark.parametrize(("duration", "mode"), MODES)
def test_mode_of_a_pulse(duration: float, mode: str) -> None:
    assert single(needs(line(1064, pulse(1e-3, duration)))).mode == mode


def test_continuous_by_hand() -> None:
    """d63 = 2 mm/sqrt 2; 0.1 W / (pi/4 x 2e-6 m2) = 63 662 W/m2: LB4 (1e5).

    With 1.41421^1.7 = 1.8025 (from memory) 114 751 W/m2: LB5.
    """
    need = single(needs(line(532, cw(0.1))))
    assert need.value == pytest.approx(63_662, abs=0.5)
    assert need.size_factor == pytest.approx(1.8025, abs=5e-5)
    assert (need.mode, need.pulses, need.number, need.wide) == ("D", 1.0, 4, 5)


def test_continuous_at_a_distance_by_hand() -> None:
    """10 m at 1 mrad: d^2 = 4 + 100 mm2, d63^2 = 52 mm2; 0.1 W / 4.0841e-5 m2 = 2448.5 W/m2: LB3.

    7.2111^1.7 = 28.75, so 70 396 W/m2: LB4.
    """
    need = single(needs(line(532, cw(0.1)), 10.0))
    assert need.value == pytest.approx(2448.5, abs=0.05)
    assert need.size_factor == pytest.approx(28.75, abs=0.005)
    assert (need.number, need.wide) == (3, 4)


#: A top hat of 5 mm: 1.96350e-5 m2, size factor 5^1.7 = 15.426.
FIVE: dict[str, Any] = {"profile": "tophat", "diameter_mm": 5}


def test_elliptical_beam_by_hand() -> None:
    """1 W on 2 x 8 mm: pi/4 x 16e-6 m2 = 1.25664e-5, 79 577 W/m2: LB4; the wider axis, 8^1.7 = 34.30."""
    need = single(needs(line(1064, cw(1.0), profile="tophat", diameter_mm=[2, 8])))
    assert need.value == pytest.approx(79_577, abs=0.5)
    assert need.size_factor == pytest.approx(34.30, abs=0.005)
    # 79 577 x 34.30 = 2.73e6 W/m2: LB6
    assert (need.number, need.wide) == (4, 6)


PULSES = {
    # 10 mJ / 1.9635e-5 m2 = 509.30 J/m2, LB5 ends at 500.
    "giant pulse": (line(1064, pulse(1e-2, 8e-9), **FIVE), "R", 509.30, 6),
    # 1 J / 3.14159e-6 m2 = 318 310 J/m2, LB8 ends at 5e5.
    "long pulse": (line(1064, pulse(1.0, 1e-3), profile="tophat"), "I", 318_310.0, 8),
    # 0.1 J / 1.9635e-5 m2 = 5093 J/m2 at 10.6 um, LB2 ends at 1e4.
    "far infrared": (line(10600, pulse(0.1, 1e-4), **FIVE), "I", 5093.0, 2),
    # 1 mJ / 1.9635e-5 m2 = 50.930 J/m2, LB6 ends at 150.
    "mode-locked": (line(800, pulse(1e-3, 1e-13), **FIVE), "M", 50.930, 6),
}


@pytest.mark.parametrize(("only", "mode", "value", "number"), PULSES.values(), ids=PULSES.keys())
def test_single_pulse_by_hand(only: dict[str, Any], mode: str, value: float, number: int) -> None:
    """No average power, no pulse number and no size factor."""
    need = single(needs(only))
    assert need.value == pytest.approx(value, rel=1e-4)
    assert (need.mode, need.number, need.wide) == (mode, number, number)
    assert (need.pulses, need.size_factor) == (1.0, 1.0)


def two(found: list[ScaleNeed], mode: str) -> tuple[ScaleNeed, ScaleNeed]:
    """The pulse criterion and, beside it, the one of the average power."""
    assert [n.mode for n in found] == [mode, "D"]
    return found[0], found[1]


def test_train_by_hand() -> None:
    """9 mJ at 20 Hz on 5 mm, 8 ns: 458.37 J/m2 alone is LB5 (500).

    N = 5 s x 20 Hz = 100, N^(1/4) = 3.1623: 1449.5 J/m2, LB6. Average 0.18 W: 9167 W/m2, LB3; with
    15.426 it is 141 415 W/m2, LB5.
    """
    shot, mean = two(needs(line(1064, train(9e-3, 8e-9, 20), **FIVE)), "R")
    assert shot.pulses == 100
    assert shot.value == pytest.approx(1449.5, abs=0.1)
    assert (shot.number, shot.wide) == (6, 6)
    assert mean.value == pytest.approx(9167.3, abs=0.1)
    assert mean.size_factor == pytest.approx(15.426, abs=5e-4)
    assert (mean.number, mean.wide) == (3, 5)


SINGLY = {
    "1 Hz is not above 1 Hz": (line(1064, train(9e-3, 8e-9, 1), **FIVE), 1.0),
    "ultraviolet": (line(355, train(9e-3, 8e-9, 20), **FIVE), 1.0),
    "just below 400 nm": (line(399.9, train(9e-3, 8e-9, 20), **FIVE), 1.0),
    "400 nm": (line(400, train(9e-3, 8e-9, 20), **FIVE), 100.0),
    "just above 1 Hz": (line(1064, train(9e-3, 8e-9, 1.2), **FIVE), 6.0),
    "beyond 1400 nm": (line(2100, train(9e-3, 1e-4, 20), **FIVE), 100.0),
}


@pytest.mark.parametrize(("only", "pulses"), SINGLY.values(), ids=SINGLY.keys())
def test_where_the_pulse_number_counts(only: dict[str, Any], pulses: float) -> None:
    """400 nm to 1 mm, pulses below 0.25 s, above 1 Hz; 458.37 J/m2 x N^(1/4)."""
    shot = needs(only)[0]
    assert shot.pulses == pytest.approx(pulses, rel=1e-12)
    assert shot.value == pytest.approx(458.37 * pulses**0.25, rel=1e-5)


def test_pulses_within_the_grouping_time_by_hand() -> None:
    """1 uJ at 1 MHz, 532 nm, 5 mm: 0.050930 J/m2 a pulse, 18 of them within 18 us: 0.91673 J/m2.

    N = 5 s / 18 us = 277 778, N^(1/4) = 22.957: 21.046 J/m2, LB4 (50). 1 W: 50 930 W/m2, LB4; with
    15.426 it is 785 640 W/m2, LB5. The grouping time is from memory.
    """
    shot, mean = two(needs(line(532, train(1e-6, 1e-8, 1e6), **FIVE)), "R")
    assert shot.pulses == pytest.approx(277_778, abs=0.5)
    assert shot.value == pytest.approx(21.046, abs=1e-3)
    assert (shot.number, mean.number, mean.wide) == (4, 4, 5)


@pytest.mark.parametrize(("wavelength", "group"), [(532, 18e-6), (1200, 50e-6), (1450, 1e-3), (2000, 1e-3)])
def test_grouping_joins_counting_without_a_step(wavelength: float, group: float) -> None:
    """At a period of Ti both ways give H (5/Ti)^(1/4); twice as fast, twice the energy (from memory)."""
    alone = 5.0930e-2 * (5 / group) ** 0.25
    for rate, times in ((1 / group * (1 - 1e-9), 1.0), (1 / group, 1.0), (2 / group, 2.0)):
        shot = needs(line(wavelength, train(1e-6, 1e-8, rate), **FIVE))[0]
        assert shot.value == pytest.approx(alone * times, rel=1e-4)


@pytest.mark.parametrize(("wavelength", "number"), [(266, 4), (315, 4), (2000, 4), (10600, 4)])
def test_mode_locked_beside_the_visible_is_peak_irradiance(wavelength: float, number: int) -> None:
    """1 mJ in 10 ps on 1 mm: 1e-3/1e-11/7.85398e-7 = 1.27324e14 W/m2, of one pulse, whatever the rate.

    Up to 315 nm LB3 ends at 3e13, beyond 1400 nm at 1e14.
    """
    beam: dict[str, Any] = {"profile": "tophat", "diameter_mm": 1}
    once = single(needs(line(wavelength, pulse(1e-3, 1e-11), **beam)))
    often, mean = two(needs(line(wavelength, train(1e-3, 1e-11, 1000), **beam)), "M")
    for need in (once, often):
        assert need.value == pytest.approx(1.27324e14, rel=1e-5)
        assert (need.row.quantity, need.pulses, need.number) == ("E", 1.0, number)
    # 1 W / 7.85398e-7 m2
    assert mean.value == pytest.approx(1.27324e6, rel=1e-5)


def test_mode_locked_train_between_counts_its_pulses() -> None:
    """80 MHz, 1 nJ, 100 fs, 800 nm, 5 mm: 1440 pulses in 18 us, 7.3339e-2 J/m2, x 22.957 = 1.6837: LB5."""
    shot, mean = two(needs(line(800, train(1e-9, 1e-13, 8e7), **FIVE)), "M")
    assert shot.value == pytest.approx(1.6837, rel=1e-4)
    assert shot.number == 5
    # 0.08 W / 1.9635e-5 m2 = 4074.4 W/m2
    assert mean.value == pytest.approx(4074.4, abs=0.1)


def test_pulses_longer_than_a_quarter_second_are_continuous() -> None:
    """0.5 s pulses of 1 J at 1 Hz: 2 W while on, 1 W on average, both mode D."""
    on, mean = two(needs(line(1064, train(1.0, 0.5, 1.0), **FIVE)), "D")
    assert on.value == pytest.approx(101_859, abs=1)
    assert mean.value == pytest.approx(50_930, abs=1)
    assert (on.number, mean.number) == (5, 4)


@pytest.mark.parametrize(
    ("width", "factor"),
    [(0.1, 1.0), (1.0, 1.0), (2.0, 3.249), (10.0, 50.12), (15.0, 99.85), (15.1, 99.85), (80.0, 99.85)],
)
def test_size_factor(width: float, factor: float) -> None:
    """d^1.7 from 1 mm on, held at 15 mm (from memory): 2^1.7 = 3.249, 10^1.7 = 50.12, 15^1.7 = 99.85."""
    for wavelength in (315.001, 532, 1064, 10600):
        need = single(needs(line(wavelength, cw(1), profile="tophat", diameter_mm=width)))
        assert need.size_factor == pytest.approx(factor, rel=2e-4)


@pytest.mark.parametrize("wavelength", [180, 266, 314.9])
def test_no_size_factor_below_315_nm(wavelength: float) -> None:
    assert single(needs(line(wavelength, cw(1), profile="tophat", diameter_mm=10))).size_factor == 1.0


ALIGNING_POWER = [(1e-6, 0), (1e-3, 0), (1.001e-3, 1), (0.01, 1), (0.01001, 2), (0.1, 2), (0.101, 3), (1, 3),
                  (1.01, 4), (10, 4), (10.1, 5), (100, 5), (101, None), (1e4, None)]  # fmt: skip
ALIGNING_ENERGY = [(1e-9, 0), (2e-7, 0), (2.01e-7, 1), (2e-6, 1), (2.01e-6, 2), (2e-5, 2), (2e-4, 3),
                   (2e-3, 4), (2e-2, 5), (2.01e-2, None)]  # fmt: skip


@pytest.mark.parametrize(("power", "number"), ALIGNING_POWER)
@pytest.mark.parametrize("wavelength", [400, 532, 700])
def test_alignment_by_power(power: float, number: int | None, wavelength: float) -> None:
    """None at 1 mW, RB1 to 0.01 W, RB5 to 100 W (from memory), beyond it no number."""
    need = aligning(line(wavelength, cw(power), **NARROW))
    assert need is not None
    assert (need.unit, need.number) == ("W", number)
    assert need.value == pytest.approx(power, rel=1e-12)


@pytest.mark.parametrize(("energy", "number"), ALIGNING_ENERGY)
@pytest.mark.parametrize("seconds", [1e-9, 1e-6, 2e-4])
def test_alignment_by_pulse_energy(energy: float, number: int | None, seconds: float) -> None:
    """A tenth of RB1's 2e-6 J needs none; RB5 ends at 0.02 J (from memory); from 1 ns to 0.2 ms."""
    need = aligning(line(532, pulse(energy, seconds), **NARROW))
    assert need is not None
    assert (need.unit, need.number) == ("J", number)


def test_alignment_counts_pulses_within_ten_seconds() -> None:
    """1 uJ, 10 ns, 1 kHz: N = 10^4, N^(1/4) = 10, so 1e-5 J: RB2."""
    need = aligning(line(532, train(1e-6, 1e-8, 1e3), **NARROW))
    assert need is not None
    assert need.value == pytest.approx(1e-5, rel=1e-12)
    assert (need.unit, need.number) == ("J", 2)


def test_alignment_takes_the_power_of_long_pulses() -> None:
    """0.3 ms is above 0.2 ms: 3e-5 J / 3e-4 s = 0.1 W while on, RB2."""
    for emission in (pulse(3e-5, 3e-4), train(3e-5, 3e-4, 100)):
        need = aligning(line(532, emission, **NARROW))
        assert need is not None
        assert need.value == pytest.approx(0.1, rel=1e-12)
        assert (need.unit, need.number) == ("W", 2)


def test_alignment_takes_what_passes_seven_millimetres() -> None:
    """40 mW on a top hat of 14 mm: a quarter, 10 mW, passes 7 mm, RB1; on 5 mm all of it, RB2."""
    wide = aligning(line(532, cw(0.04), profile="tophat", diameter_mm=14))
    narrow = aligning(line(532, cw(0.04), **FIVE))
    assert wide is not None
    assert narrow is not None
    assert wide.value == pytest.approx(0.01, rel=1e-9)
    assert (wide.number, narrow.number) == (1, 2)


@pytest.mark.parametrize("wavelength", [266, 399.9, 700.1, 1064])
def test_alignment_is_for_the_visible_only(wavelength: float) -> None:
    assert aligning(line(wavelength, cw(1))) is None


def test_alignment_has_no_number_below_a_nanosecond() -> None:
    assert aligning(line(532, pulse(1e-6, 9e-10))) is None
