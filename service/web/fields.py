"""The fields of the form: what each is called, where a data sheet gives it, its units and choices."""

from __future__ import annotations

from typing import NamedTuple

from service.contract.request import MAX_LINES, MAX_PAIRS

__all__ = [
    "ADDRESS_VERSION",
    "AID",
    "BEAM",
    "ELEMENTS",
    "EMISSION",
    "FIELDS",
    "KINDS",
    "LINE_FIELDS",
    "PARTS",
    "TEXT",
    "TOP",
    "Field",
    "Part",
    "field_name",
    "label_of",
    "split_name",
]

ADDRESS_VERSION = "1"


class Field(NamedTuple):
    """One field: its label, help, family of units (blank for text) and choices by value."""

    label: str
    help: str = ""
    family: str = ""
    choices: tuple[tuple[str, str], ...] = ()
    limit: int = 200

    @property
    def number(self) -> bool:
        """Whether the field holds a number."""
        return bool(self.family)


class Part(NamedTuple):
    """A repeated part of the form: its fields, how many there may be, its name, and where it stands."""

    fields: tuple[str, ...]
    least: int
    most: int
    word: str
    place: str


FIELDS: dict[str, Field] = {
    "label": Field("Name of this laser", "Your own words, up to 200 characters."),
    "place": Field("Where it stands", "Room and bench."),
    "asked_by": Field("Who asks", "Stands on the printed sheet."),
    "basis": Field(
        "Where the figures come from",
        choices=(("measured", "measured"), ("data_sheet", "data sheet"), ("bound", "bound, not measured")),
    ),
    "rules": Field("Judged by"),
    "look": Field("How long"),
    "exposure_s": Field("Exposure duration", "One exposure, or all of a day together.", "time"),
    "distance_m": Field(
        "Viewing distance",
        "Evaluated there too; counted from the last element.",
        "distance",
    ),
    "visibility_km": Field("Visibility", "Outdoors, in haze. Blank: clear air, the stricter.", "visibility"),
    "outdoors": Field("Airspace", choices=(("1", "outdoors: tell how far it disturbs pilots"),)),
    "aid_objective_mm": Field(
        "Diameter of the objective", "The second figure on binoculars: 7 × 50 has 50 mm.", "width"
    ),
    "aid_magnification": Field("Magnification", "The first figure on binoculars; also on loupes.", "bare"),
    "aid_transmittance": Field("Transmittance of the optics", "Blank: 1, the strictest.", "share"),
    "wavelength_nm": Field(
        "Wavelength",
        "Data sheet: centre or peak wavelength; also on the label of the laser. 180 nm to 1 mm.",
        "wavelength",
    ),
    "mode": Field(
        "Emission", choices=(("cw", "continuous"), ("pulse", "single pulse"), ("train", "pulse train"))
    ),
    "power_w": Field(
        "Power",
        "Data sheet: maximum output power, not the typical; also on the label.",
        "power",
    ),
    "energy_j": Field("Energy of one pulse", "Data sheet: pulse energy, the highest setting.", "energy"),
    "average_power_w": Field("Average power", "Data sheet: average power at this rate.", "power"),
    "rate_hz": Field("Repetition rate", "Data sheet: repetition or pulse frequency.", "rate"),
    "pulse_s": Field(
        "Pulse duration", "Data sheet: pulse width, full width at half maximum (FWHM); the shortest.", "time"
    ),
    "output_mirror_reflectance": Field(
        "Reflectance of the output mirror",
        "Only with the resonator open: the beam inside, going one way, is judged.",
        "share",
    ),
    "profile": Field(
        "Kind of beam",
        choices=(
            ("gaussian", "Gaussian"),
            ("tophat", "top hat"),
            ("fibre_single_mode", "end of a single-mode fibre"),
            ("fibre_multimode", "end of a multimode fibre"),
        ),
    ),
    "diameter_mm": Field(
        "Beam diameter", "Data sheet: beam diameter or beam waist, at the exit unless given below.", "width"
    ),
    "diameter_y_mm": Field("Diameter, other axis", "Elliptical beams only.", "width"),
    "divergence_mrad": Field(
        "Divergence, full angle", "Data sheet: beam divergence; a half angle counts double.", "angle"
    ),
    "divergence_y_mrad": Field("Divergence, other axis", "Elliptical beams only.", "angle"),
    "level": Field(
        "Diameter and divergence at",
        "Not stated? 1/e² is the usual meaning and the stricter reading.",
        choices=(("1/e2", "1/e² of the peak"), ("1/e", "1/e of the peak")),
    ),
    "waist_m": Field("Waist position", "Ahead of the exit is positive. Blank: at the exit.", "distance"),
    "diameter_at": Field("Diameter given at", choices=(("waist", "the waist"), ("exit", "the exit"))),
    "mode_field_diameter_um": Field(
        "Mode field diameter", "Data sheet of the fibre, at this wavelength.", "core"
    ),
    "numerical_aperture": Field("Numerical aperture", "Data sheet of the fibre: NA.", "bare"),
    "core_diameter_um": Field("Core diameter", "Data sheet of the fibre: 50 µm of 50/125.", "core"),
    "subtense_mrad": Field("Source subtense α", "Blank: 1.5 mrad, a small source (strictest).", "angle"),
    "bench_length_m": Field("Length", "Way to the next element.", "distance"),
    "bench_focal_mm": Field("Focal length", "Negative: the lens spreads the beam.", "width"),
    "bench_radius_mm": Field("Radius of curvature", "Concave is positive.", "width"),
    "bench_magnification": Field("Magnification", "Diameter behind over diameter before.", "bare"),
    "bench_reflectance": Field("Reflectance", "Share of the power that goes on.", "share"),
    "bench_refractive_index": Field("or refractive index", "Reflectance follows from the angle.", "bare"),
    "bench_material": Field("or material"),
    "bench_transmittance": Field("Transmittance", "Blank: 1, nothing is lost.", "share"),
    "bench_incidence_deg": Field("Angle of incidence", "From the normal; blank: 0.", "turn"),
    "bench_polarisation": Field(
        "Polarisation",
        choices=(("s", "s, or unknown: strictest"), ("unpolarised", "unpolarised"), ("p", "p")),
    ),
    "bench_surfaces": Field("Reflecting surfaces", choices=(("1", "one"), ("2", "both sides of a plate"))),
    "bench_viewing_deg": Field("Angle of view", "From the normal of the surface; blank: 0.", "turn"),
    "bench_angle_deg": Field("Full angle of the sweep", "", "turn"),
    "bench_sweeps_hz": Field("Sweeps a second", "To and fro counted apart.", "rate"),
    "bench_motion": Field("Motion", choices=(("even", "even"), ("sinusoidal", "swinging, slow at the ends"))),
    "bench_rows": Field("Rows", "A raster only; blank: a line.", "bare"),
    "bench_height_deg": Field("Height of the raster", "A raster only.", "turn"),
    "elements": Field("What the light meets"),
    "protection": Field("Protection at hand"),
    "pair_name": Field("Name of the pair"),
    "pair_ranges": Field("Ranges", "As marked: 780-1100: OD 7 | D LB6 + IR LB7; 532: OD 5", limit=2000),
    "pair_light_percent": Field(
        "Luminous transmittance", "Share of daylight that passes (VLT); blank if unknown.", "percent"
    ),
    "window_name": Field("Name of the window"),
    "window_distance_m": Field("Distance of the window", "From the last element.", "distance"),
    "window_density": Field("Its optical density", "Blank: only what it needs is told.", "bare"),
}

AID = ("aid_objective_mm", "aid_magnification", "aid_transmittance")
#: Fields that the request takes as they stand.
TEXT = ("label", "rules", "basis")
LOOK = ("look", "exposure_s", "distance_m", "visibility_km", "outdoors")
TOP = ("label", "place", "asked_by", *TEXT[1:], *LOOK, *AID)
#: Fields that belong to a kind of emission, of beam, of element; others of the same sort must be blank.
EMISSION = {
    "cw": ("power_w",),
    "pulse": ("energy_j", "pulse_s"),
    "train": ("energy_j", "average_power_w", "rate_hz", "pulse_s"),
}
FREE = (
    "diameter_mm",
    "divergence_mrad",
    "diameter_y_mm",
    "divergence_y_mrad",
    "level",
    "waist_m",
    "diameter_at",
)
BEAM = {
    "gaussian": FREE,
    "tophat": FREE,
    "fibre_single_mode": ("mode_field_diameter_um",),
    "fibre_multimode": ("numerical_aperture", "core_diameter_um"),
}
ELEMENTS: dict[str, tuple[str, tuple[str, ...]]] = {
    "space": ("Free space", ("bench_length_m",)),
    "lens": ("Lens", ("bench_focal_mm", "bench_transmittance")),
    "mirror": ("Curved mirror", ("bench_radius_mm", "bench_reflectance", "bench_incidence_deg")),
    "expander": ("Beam expander", ("bench_magnification", "bench_transmittance")),
    "reflector": (
        "Flat reflector",
        (
            "bench_reflectance",
            "bench_refractive_index",
            "bench_material",
            "bench_incidence_deg",
            "bench_polarisation",
            "bench_surfaces",
        ),
    ),
    "window": ("Window or filter", ("bench_transmittance",)),
    "diffuser": ("Diffuser", ("bench_reflectance", "bench_viewing_deg")),
    "scanner": (
        "Scanner",
        ("bench_angle_deg", "bench_sweeps_hz", "bench_motion", "bench_rows", "bench_height_deg"),
    ),
}
LINE_FIELDS = (
    "wavelength_nm",
    "mode",
    "power_w",
    "energy_j",
    "average_power_w",
    "pulse_s",
    "rate_hz",
    "output_mirror_reflectance",
    "profile",
    *FREE[:5],
    *FREE[5:],
    "mode_field_diameter_um",
    "numerical_aperture",
    "core_diameter_um",
    "subtense_mrad",
)
KINDS = tuple(ELEMENTS)
BENCH_FIELDS = ("bench_kind", *dict.fromkeys(n for _, names in ELEMENTS.values() for n in names))
FIELDS["bench_kind"] = Field("Element", choices=tuple((k, words) for k, (words, _) in ELEMENTS.items()))
PARTS = {
    "lines": Part(LINE_FIELDS, 1, MAX_LINES, "line", "lines"),
    "elements": Part(BENCH_FIELDS, 0, 32, "element", "elements"),
    "pairs": Part(("pair_name", "pair_ranges", "pair_light_percent"), 0, MAX_PAIRS, "pair", "protection"),
    "windows": Part(
        ("window_name", "window_distance_m", "window_density"), 0, MAX_PAIRS, "window", "protection"
    ),
}


def field_name(name: str, number: int) -> str:
    """Form field of a part, counted from 1."""
    return f"{name}-{number}"


def split_name(name: str) -> tuple[str, int]:
    """The field and the number of its part; 0 for a field of the whole form."""
    base, _, number = name.rpartition("-")
    return (base, int(number)) if base in FIELDS and number.isdecimal() else (name, 0)


def label_of(name: str, lines: int) -> str:
    """What the page calls a field, with the number of its part where there are several."""
    base, number = split_name(name)
    if name.startswith("line-"):
        return f"Emission line {name.removeprefix('line-')}" if lines > 1 else "What it emits"
    if base not in FIELDS:
        return name
    label = FIELDS[base].label
    if base in PARTS["elements"].fields:
        return f"{label[:1].upper() + label[1:]} (element {number})"
    if base in PARTS["pairs"].fields:
        return f"{label} (pair {number})"
    if base in PARTS["windows"].fields:
        return f"{label} (window {number})"
    return f"{label} (line {number})" if number and lines > 1 else label
