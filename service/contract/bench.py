"""Bench elements and fibre ends of the request, and what they make of a beam."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Annotated, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator

from service.assess.lines import Lines
from service.assess.moving import Setup, Spots, lambertian
from service.assess.steps import Step, number
from service.contract.strict import Strict
from service.files import DATA
from service.optics.beams import Beams
from service.optics.elements import expander, fresnel, lens, mirror, plate, space, through
from service.optics.sweep import Scan
from service.rules.materials import material_row, materials

__all__ = [
    "ELEMENTS",
    "LEAST",
    "BenchElement",
    "Diffuser",
    "Element",
    "Scanner",
    "apply",
    "bench_steps",
    "last_is_last",
    "setup_of",
]

Floats = NDArray[np.float64]
#: What is left behind a bench is never quite nothing [W or J].
LEAST = 1e-100
Share = Annotated[float, Field(ge=1e-20, le=1)]


class Space(Strict):
    """Free space between elements."""

    element: Literal["space"]
    length_m: float = Field(ge=0, le=1e6)


class Lens(Strict):
    """A thin lens; a negative focal length diverges."""

    element: Literal["lens"]
    focal_mm: float = Field(ge=-1e9, le=1e9)
    transmittance: Share = 1.0

    @model_validator(mode="after")
    def _not_zero(self) -> Lens:
        if abs(self.focal_mm) < 1e-3:
            raise ValueError("focal_mm is too near to zero")
        return self


class Mirror(Strict):
    """A curved mirror, concave with a positive radius, hit at an angle in the plane of the x axis."""

    element: Literal["mirror"]
    radius_mm: float = Field(ge=-1e9, le=1e9)
    reflectance: Share = 1.0
    incidence_deg: float = Field(0.0, ge=0, le=89)

    @model_validator(mode="after")
    def _not_zero(self) -> Mirror:
        if abs(self.radius_mm) < 1e-3:
            raise ValueError("radius_mm is too near to zero")
        return self


class Expander(Strict):
    """An afocal beam expander: diameters times the magnification, angles by it."""

    element: Literal["expander"]
    magnification: float = Field(ge=1e-3, le=1e3)
    transmittance: Share = 1.0


class WindowElement(Strict):
    """A window, filter or attenuator."""

    element: Literal["window"]
    transmittance: Share


class Reflector(Strict):
    """A flat reflecting surface: its reflectance, its refractive index, or a material of the table.

    With an index the reflectance follows from angle and polarisation (Fresnel).
    """

    element: Literal["reflector"]
    reflectance: Share | None = None
    refractive_index: float | None = Field(None, ge=1, le=10)
    material: str | None = Field(None, max_length=100, description="See GET /api/v1/materials.")
    incidence_deg: float = Field(0.0, ge=0, le=90)
    polarisation: Literal["s", "p", "unpolarised"] = "unpolarised"
    surfaces: Literal[1, 2] = Field(1, description="2: a plate that reflects from both sides.")

    @model_validator(mode="after")
    def _one_of_three(self) -> Reflector:
        given = [self.reflectance, self.refractive_index, self.material]
        if sum(x is not None for x in given) != 1:
            raise ValueError("give reflectance, refractive_index or material, one of the three")
        if self.material is not None and self.material not in materials(DATA):
            raise ValueError(f"unknown material; there are {', '.join(materials(DATA))}")
        return self

    def share(self, wavelength_nm: float) -> float:
        """Share of the power that is reflected, never quite 0 (no surface is perfect)."""
        one, index = self.reflectance, self.refractive_index
        if self.material is not None:
            row = material_row(materials(DATA)[self.material], wavelength_nm)
            one, index = row.reflectance, row.refractive_index
        if one is None:
            assert index is not None
            one = fresnel(index, math.radians(self.incidence_deg), self.polarisation)
        return max(plate(one) if self.surfaces == 2 else one, 1e-20)


class Diffuser(Strict):
    """A matt surface on which the beam ends; it scatters evenly by Lambert's law. The last element.

    The lit spot is the source. A ground glass that scatters forwards counts the same with what it passes.
    """

    element: Literal["diffuser"]
    reflectance: Share = Field(1.0, description="Share of the power that is scattered.")
    viewing_deg: float = Field(0.0, ge=0, le=85, description="Angle from the normal of the surface.")


class Scanner(Strict):
    """A mirror that sweeps the beam to and fro along the x axis. The last element."""

    element: Literal["scanner"]
    angle_deg: float = Field(ge=1e-3, le=170, description="Full angle of the sweep.")
    sweeps_hz: float = Field(
        ge=1e-3, le=1e7, description="Sweeps over the whole angle each second, to and fro counted apart."
    )
    motion: Literal["even", "sinusoidal"] = Field(
        "even", description="Speed along the sweep: even, or that of a mirror swinging like a pendulum."
    )
    rows: int = Field(1, ge=1, le=100000, description="1: a line; more: sweeps above each other, a raster.")
    height_deg: float | None = Field(None, ge=1e-3, le=170, description="Height of the raster.")

    @model_validator(mode="after")
    def _raster_has_a_height(self) -> Scanner:
        if (self.rows > 1) != (self.height_deg is not None):
            raise ValueError("give rows above 1 and height_deg for a raster, neither for a line")
        return self

    def scan(self) -> Scan:
        """The sweep in radians."""
        return Scan(
            angle_rad=math.radians(self.angle_deg),
            sweeps_hz=self.sweeps_hz,
            sinusoidal=self.motion == "sinusoidal",
            rows=self.rows,
            height_rad=math.radians(self.height_deg or 0.0),
        )


ELEMENTS = ("space", "lens", "mirror", "expander", "window", "reflector", "diffuser", "scanner")
BenchElement = Space | Lens | Mirror | Expander | WindowElement | Reflector | Diffuser | Scanner
Element = Annotated[BenchElement, Field(discriminator="element")]


def last_is_last(bench: list[BenchElement]) -> list[BenchElement]:
    """The bench, if nothing stands behind a diffuser or scanner. Raises ValueError."""
    for element in bench[:-1]:
        if isinstance(element, Diffuser | Scanner):
            raise ValueError(
                f"a {element.element} must be the last element; put windows and filters before it"
            )
    return bench


def setup_of(bench: list[BenchElement], lines: Lines) -> Setup | None:
    """What a bench whose last element is a diffuser or scanner makes of one laser's lines in front of it."""
    last = bench[-1] if bench else None
    if isinstance(last, Scanner):
        return Setup(lines, scan=last.scan())
    if not isinstance(last, Diffuser):
        return None
    viewing = math.radians(last.viewing_deg)
    x, y = lines.beams.diameters_m(np.zeros(lines.count))
    scattered = replace(
        lines,
        emitted=np.maximum(lines.emitted * last.reflectance, LEAST),
        subtense_mrad=np.zeros(lines.count),
        beams=lambertian(lines, viewing),
    )
    return Setup(scattered, spots=Spots(x, y, viewing))


def _one(element: BenchElement, beams: Beams, wavelength_nm: Floats) -> tuple[Beams, Floats]:
    """Beams behind one element and the share of power that is left of each."""
    whole = np.ones(wavelength_nm.shape)
    if isinstance(element, Space):
        return through(beams, space(element.length_m)), whole
    if isinstance(element, Lens):
        return through(beams, lens(element.focal_mm * 1e-3)), whole * element.transmittance
    if isinstance(element, Mirror):
        matrices = mirror(element.radius_mm * 1e-3, math.radians(element.incidence_deg))
        return through(beams, matrices), whole * element.reflectance
    if isinstance(element, Expander):
        return through(beams, expander(element.magnification)), whole * element.transmittance
    if isinstance(element, WindowElement):
        return beams, whole * element.transmittance
    if isinstance(element, Reflector):
        return beams, np.array([element.share(w) for w in wavelength_nm.tolist()])
    return beams, whole


def apply(bench: list[BenchElement], beams: Beams, wavelength_nm: Floats) -> tuple[Beams, Floats]:
    """Beams behind the last element of a bench and the share of power that is left of each."""
    left = np.ones(wavelength_nm.shape)
    for element in bench:
        beams, share = _one(element, beams, wavelength_nm)
        left = left * share
    return beams, left


def bench_steps(bench: list[BenchElement], beams: Beams, wavelength_nm: Floats) -> list[Step]:
    """One step per element and line: what the element makes of the beam."""
    steps = []
    for k, element in enumerate(bench):
        beams, share = _one(element, beams, wavelength_nm)
        given = ", ".join(
            f"{n} {v}" for n, v in element.model_dump(exclude_none=True, exclude={"element"}).items()
        )
        for line in range(len(beams.tophat)):
            x, y = (float(d[line]) * 1e3 for d in beams.diameters_m(np.zeros(len(beams.tophat))))
            axes = [
                f"{number(float(phi[line]) * 1e3)} mrad, waist at {number(float(z0[line]))} m"
                for _, phi, z0 in beams.axes()
            ]
            spread = axes[0] if axes[0] == axes[1] else " and ".join(axes)
            width = number(x) if x == y else f"{number(x)} x {number(y)}"
            text = f"{element.element} ({given}): beam of {width} mm there, {spread}; "
            if isinstance(element, Diffuser):
                text += "that is the lit spot; E = reflectance x P x cos(theta) / (pi r^2) at r from it"
            elif isinstance(element, Scanner):
                text += "swept from here on"
            else:
                text += f"share of power {number(float(share[line]))}"
            steps.append(Step(f"bench {k + 1}", text, x, "mm", line=line))
    return steps
