"""Second moments and fractions of images that are known beforehand."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import dblquad

from service.optics.profile import FlatImage, background_of, moments, worst_fraction
from tests.profile.images import gaussian, spots

PIXEL = 1e-5


@pytest.mark.parametrize("turned", [0.0, 0.3, -1.2])
@pytest.mark.parametrize("noise", [0.0, 40.0])
def test_second_moments_of_a_gaussian_are_its_diameters(turned: float, noise: float) -> None:
    """4 sigma of a Gaussian is its 1/e2 diameter: ISO 11146-1 (from memory)."""
    image = gaussian(1.2, 0.8, turned, noise=noise)
    found = moments(image - background_of(image), PIXEL, PIXEL)
    assert found.major_m == pytest.approx(1.2e-3, rel=6e-3 if noise else 1e-6)
    assert found.minor_m == pytest.approx(0.8e-3, rel=6e-3 if noise else 1e-6)
    assert np.tan(found.azimuth_rad) == pytest.approx(np.tan(turned), abs=0.01)
    assert (found.x_m, found.y_m) == pytest.approx((0.48 * 640 * PIXEL, 0.53 * 480 * PIXEL), rel=1e-3)


def test_uniform_disc_has_its_own_diameter() -> None:
    """Second-moment diameter of a uniform disc equals its diameter (worked by hand: sigma = d / 4)."""
    found = moments(spots([(1.5, 1.4)], 1.0), PIXEL, PIXEL)
    assert (found.width_x_m, found.width_y_m) == pytest.approx((1e-3, 1e-3), rel=1e-3)


@pytest.mark.parametrize("aperture_mm", [0.05, 0.3, 1.0, 2.5, 7.0])
def test_round_gaussian_gives_the_analytic_fraction(aperture_mm: float) -> None:
    """1 - exp(-2 (a / d)^2), d the 1/e2 diameter."""
    image = gaussian(1.0, 1.0, offset=0.0)
    found = moments(image, PIXEL, PIXEL)
    fraction, x, y = worst_fraction(image, PIXEL, PIXEL, aperture_mm * 1e-3, found.total)
    exact = 1.0 - np.exp(-2.0 * aperture_mm**2)
    assert fraction == pytest.approx(exact, rel=5e-4)
    if aperture_mm <= 1.0:
        assert (x, y) == pytest.approx((found.x_m, found.y_m), abs=PIXEL)


def test_elliptical_gaussian_against_quadrature() -> None:
    image = gaussian(1.2, 0.6, 0.4, offset=0.0)
    found = moments(image, PIXEL, PIXEL)
    fraction, _, _ = worst_fraction(image, PIXEL, PIXEL, 0.7e-3, found.total)

    def density(v: float, u: float) -> float:
        return 8.0 / (np.pi * 1.2 * 0.6) * np.exp(-8.0 * ((u / 1.2) ** 2 + (v / 0.6) ** 2))

    exact = dblquad(
        density, -0.35, 0.35, lambda u: -np.sqrt(0.1225 - u * u), lambda u: np.sqrt(0.1225 - u * u)
    )[0]
    assert fraction == pytest.approx(exact, rel=1e-3)


def test_aperture_goes_to_the_worst_place() -> None:
    """Of three discs two lie together: 2/3 of the light within 0.6 mm of their middle, not at the centre."""
    image = spots([(0.5, 0.5), (0.75, 0.5), (2.4, 2.4)], 0.2)
    found = moments(image, PIXEL, PIXEL)
    fraction, x, y = worst_fraction(image, PIXEL, PIXEL, 0.6e-3, found.total)
    assert fraction == pytest.approx(2.0 / 3.0, rel=1e-4)
    assert np.hypot(x * 1e3 - 0.625, y * 1e3 - 0.5) < 0.1


def test_pixels_that_are_no_squares() -> None:
    image = gaussian(1.0, 1.0, offset=0.0)
    joined = image.reshape(240, 2, 640).sum(axis=1)
    found = moments(joined, PIXEL, 2.0 * PIXEL)
    assert (found.width_x_m, found.width_y_m) == pytest.approx((1e-3, 1e-3), rel=1e-3)
    fraction, _, _ = worst_fraction(joined, PIXEL, 2.0 * PIXEL, 0.5e-3, found.total)
    assert fraction == pytest.approx(1.0 - np.exp(-0.5), rel=2e-3)


@pytest.mark.parametrize("scale", [2, 5])
def test_wide_apertures_on_fine_pixels_join_them_without_harm(scale: int) -> None:
    """The same beam with finer pixels: the aperture is 100 pixels times scale wide."""
    image = gaussian(1.0, 1.0, pixel_mm=0.01 / scale, shape=(400 * scale, 400 * scale), offset=0.0)
    found = moments(image, PIXEL / scale, PIXEL / scale)
    fraction, _, _ = worst_fraction(image, PIXEL / scale, PIXEL / scale, 1e-3, found.total)
    assert fraction == pytest.approx(1.0 - np.exp(-2.0), rel=5e-4)


def test_an_aperture_far_wider_than_the_image_holds_all() -> None:
    image = spots([(1.5, 1.4)], 1.0)
    assert worst_fraction(image, 1e-11, 1e-11, 1e-3, float(image.sum()))[0] == 1.0


def test_fraction_grows_with_the_aperture() -> None:
    image = spots([(0.7, 0.5), (2.0, 1.5)], 0.4)
    total = moments(image, PIXEL, PIXEL).total
    sizes = np.geomspace(5e-6, 5e-3, 25)
    fractions = [worst_fraction(image, PIXEL, PIXEL, float(a), total)[0] for a in sizes]
    assert (np.diff(fractions) >= -2e-3).all()
    assert fractions[-1] == pytest.approx(1.0, rel=1e-4)


def test_nothing_is_no_beam() -> None:
    with pytest.raises(FlatImage):
        moments(np.zeros((40, 40)), PIXEL, PIXEL)


def test_a_beam_in_one_corner_is_not_taken_for_background() -> None:
    image = gaussian(1.0, 1.0, centre=(0.02, 0.02))
    assert background_of(image) == pytest.approx(300.0, abs=0.5)
