"""The search finds the worst part where geometry tells which it is."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize_scalar

from service.optics.partial_source import drawn, frontier, parts

LOW, HIGH = 1.5, 100.0
#: The search is to the safe side, by at most two pixels of a side and the rim of a disc.
ABOVE = 1.03


def segment(cut: float, diameter: float) -> float:
    """Share of a disc beyond a chord that lies `cut` inside its rim (circular segment, by geometry)."""
    r = diameter / 2.0
    x = np.clip(r - cut, -r, r)
    return float((r * r * np.arccos(x / r) - x * np.sqrt(r * r - x * x)) / (np.pi * r * r))


def discs(places: list[tuple[float, float]], diameter: float, pixel: float = 0.04) -> np.ndarray:
    """Equal discs as an image."""
    count = len(places)
    x, y = np.array(places).T
    size, one = np.full(count, diameter), np.ones(count)
    return drawn(x, y, size, size, one > 0.0, one, pixel)


def score(image: np.ndarray, pixel: float = 0.04) -> float:
    """Largest share over subtense, in units of alpha_min."""
    found = parts(image, pixel, pixel, LOW, HIGH)
    return float((found.share / found.alpha_rad).max() * LOW)


def test_small_disc_is_a_point() -> None:
    assert score(discs([(0.0, 0.0)], 1.2)) == pytest.approx(1.0, rel=1e-9)


@pytest.mark.parametrize("diameter", [4.0, 10.0, 30.0])
def test_uniform_disc(diameter: float) -> None:
    """The best square leaves four equal segments out: maximise (1 - 4 segment) / side (scipy)."""
    best = minimize_scalar(
        lambda cut: -(1.0 - 4.0 * segment(cut, diameter)) / (diameter - 2.0 * cut),
        bounds=(0.0, 0.14 * diameter),
        method="bounded",
    )
    found = score(discs([(0.0, 0.0)], diameter, diameter / 300), diameter / 300)
    assert -best.fun * LOW * (1.0 - 1e-4) <= found <= -best.fun * LOW * ABOVE
    # Within 3 % of the disc as a whole, alpha_min / diameter.
    assert found == pytest.approx(LOW / diameter, rel=0.05)


@pytest.mark.parametrize("apart", [1.05, 1.5, 1.9])
def test_two_equal_discs_near_each_other_count_as_one_part(apart: float) -> None:
    """Both in one rectangle that may cut their outer rims: (1 - segment) / mean of sides (scipy)."""
    best = minimize_scalar(
        lambda cut: -(1.0 - segment(cut, 1.0)) / (0.5 * (apart + 1.0 - 2.0 * cut + LOW)),
        bounds=(0.0, 0.5),
        method="bounded",
    )
    found = score(discs([(0.0, 0.0), (apart, 0.0)], 1.0))
    assert -best.fun * LOW > 0.5
    assert -best.fun * LOW * (1.0 - 1e-3) <= found <= -best.fun * LOW * 1.07


@pytest.mark.parametrize("apart", [5.0, 10.0, 60.0])
def test_two_equal_discs_far_apart_count_one_by_one(apart: float) -> None:
    """Half the power from a point: 1/2. Together: 1.5 / mean(apart + 1, 1.5), which is less."""
    assert LOW / (0.5 * (apart + 1.0 + LOW)) < 0.5
    assert score(discs([(0.0, 0.0), (apart, 0.0)], 1.0, 0.06), 0.06) == pytest.approx(0.5, rel=1e-6)


def test_row_of_ten_bars() -> None:
    """Bars of 1 x 8 mrad every 12 mrad: one alone, a tenth over (1.5 + 8) / 2, against all in a row."""
    x = 12.0 * np.arange(10)
    image = drawn(x, 0 * x, 1.0 + 0 * x, 8.0 + 0 * x, x < -1.0, 1.0 + 0 * x, 0.25)
    alone, together = 0.1 / 4.75, (9.0 / 10.0) / (0.5 * (97.0 + 8.0))
    found = score(image, 0.25)
    assert max(alone, together) * LOW <= found <= max(alone, together) * LOW * 1.15


@settings(max_examples=25, deadline=None)
@given(
    st.lists(st.tuples(st.floats(0, 12), st.floats(0, 12), st.floats(0.2, 3)), min_size=1, max_size=5),
    st.floats(0.0, 9.0),
    st.floats(0.0, 9.0),
    st.floats(1.5, 9.0),
    st.floats(1.5, 9.0),
)
def test_no_rectangle_is_worse_than_what_is_found(
    emitters: list[tuple[float, float, float]], left: float, top: float, width: float, height: float
) -> None:
    """Points stand for the emitters here; a rectangle of any size anywhere, counted by hand."""
    x, y, power = (np.array(v) for v in zip(*emitters, strict=True))
    tiny = np.full(len(x), 1e-6)
    image = drawn(x, y, tiny, tiny, tiny > 0.0, power, 0.1)
    inside = (x >= left) & (x <= left + width) & (y >= top) & (y <= top + height)
    share = power[inside].sum() / power.sum()
    alpha = 0.5 * (width + height)
    found = parts(image, 0.1, 0.1, LOW, HIGH)
    better = frontier(found)
    assert share / alpha <= (found.share / found.alpha_rad).max() * (1.0 + 1e-9)
    assert (better.share / better.alpha_rad).max() == (found.share / found.alpha_rad).max()


def test_frontier_grows_in_both() -> None:
    found = frontier(parts(discs([(0.0, 0.0), (4.0, 3.0), (9.0, 1.0)], 1.0), 0.04, 0.04, LOW, HIGH))
    assert (np.diff(found.alpha_rad) > 0.0).all()
    assert (np.diff(found.share) > 0.0).all()
    assert found.share[-1] == pytest.approx(1.0)


def test_emitters_keep_their_power() -> None:
    draw = np.random.default_rng(3)
    x, y = draw.uniform(0, 20, (2, 40))
    size = draw.uniform(0.01, 2.0, 40)
    power = draw.uniform(0.1, 3.0, 40)
    image = drawn(x, y, size, size * 1.5, size < 1.0, power, 0.07)
    assert image.sum() == pytest.approx(power.sum(), rel=1e-12)
