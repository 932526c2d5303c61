"""Forms with pairs and windows, each with the pairs and windows that its request must hold."""

from __future__ import annotations

from typing import Any, NamedTuple

from tests.web.pages import CW, as_request

__all__ = ["FORMS", "PULSED", "SHELF", "THREE", "Filled", "beam"]


class Filled(NamedTuple):
    """Form fields, and what they stand for in the request beside the lines."""

    fields: dict[str, str]
    eyewear: list[dict[str, Any]]
    windows: list[dict[str, Any]]

    def request(self) -> dict[str, Any]:
        more = {"eyewear": self.eyewear, "windows": self.windows}
        return {**as_request(self.fields), **{k: v for k, v in more.items() if v}}


def beam(number: int, wavelength: str, power: str) -> dict[str, str]:
    """Form fields of one continuous line of 2 mm and 1 mrad."""
    values = {"wavelength_nm": wavelength, "mode": "cw", "power_w": power, "diameter_mm": "2",
              "divergence_mrad": "1"}  # fmt: skip
    return {f"{name}-{number}": value for name, value in values.items()}


#: Diode-pumped, frequency-doubled: pump, fundamental and second harmonic from one housing.
THREE = {
    "lines": "3",
    **beam(1, "808", "2"),
    **beam(2, "1064", "1"),
    **beam(3, "532", "0.1"),
}
PULSED = {
    "lines": "1",
    "wavelength_nm-1": "1064",
    "mode-1": "train",
    "energy_j-1": "9e-3",
    "pulse_s-1": "8e-9",
    "rate_hz-1": "20",
    "diameter_mm-1": "5",
    "divergence_mrad-1": "1",
    "profile-1": "tophat",
}

INFRARED = {"from_nm": 780, "to_nm": 1100, "optical_density": 7, "marking": "D LB6 + IR LB7"}
#: The demo shelf as its table prints it (invented pairs).
SHELF = {
    "near-infrared": {
        "name": "Shelf 1: near infrared",
        "luminous_transmittance": 0.62,
        "ranges": [INFRARED],
    },
    "green-and-infrared": {
        "name": "Shelf 2: green and near infrared",
        "luminous_transmittance": 0.24,
        "ranges": [
            {"from_nm": 515, "to_nm": 540, "optical_density": 6, "marking": "D LB6 + IR LB6"},
            {"from_nm": 800, "to_nm": 1090, "optical_density": 7, "marking": "D LB6 + IR LB7"},
        ],
    },
    "far-infrared": {
        "name": "Shelf 3: clear, far infrared",
        "luminous_transmittance": 0.9,
        "ranges": [{"from_nm": 9000, "to_nm": 11500, "optical_density": 6, "marking": "D LB4 + I LB4"}],
    },
    "blue-and-green": {
        "name": "Shelf 4: ultraviolet, blue and green",
        "luminous_transmittance": 0.38,
        "ranges": [
            {
                "from_nm": 190,
                "to_nm": 540,
                "optical_density": 6,
                "marking": "180-315 D LB6 + IR LB4 + 315-540 D LB5 + IR LB5",
            }
        ],
    },
    "green-alignment": {
        "name": "Shelf 5: green alignment",
        "luminous_transmittance": 0.45,
        "ranges": [{"from_nm": 510, "to_nm": 550, "marking": "RB2"}],
    },
}
WINDOW = {"window_name-1": "Door", "window_distance_m-1": "3", "window_density-1": "1.5"}
DOOR = {"name": "Door", "distance_m": 3, "optical_density": 1.5}

FORMS = {
    "two of three lines": Filled(
        {
            **THREE,
            "pairs": "1",
            "pair_name-1": "Near infrared",
            "pair_ranges-1": "780-1100: OD 7 | D LB6 + IR LB7",
            "pair_light_percent-1": "62",
        },
        [{"name": "Near infrared", "luminous_transmittance": 0.62, "ranges": [INFRARED]}],
        [],
    ),
    "the whole shelf at a distance": Filled(
        {**CW, "distance_m": "10", **{f"shelf-{key}": "1" for key in SHELF}}, [*SHELF.values()], []
    ),
    "typed beside the shelf": Filled(
        {
            **CW,
            "pairs": "2",
            "pair_ranges-1": "532: OD 5",
            "pair_name-2": "Two ranges",
            "pair_ranges-2": "500-540: D LB6 ; 1064,5 : od 7,5",
            "pair_light_percent-2": "12,5",
            "shelf-green-alignment": "1",
        },
        [
            {"name": "Pair 1", "ranges": [{"from_nm": 532, "to_nm": 532, "optical_density": 5}]},
            {
                "name": "Two ranges",
                "luminous_transmittance": 0.125,
                "ranges": [
                    {"from_nm": 500, "to_nm": 540, "marking": "D LB6"},
                    {"from_nm": 1064.5, "to_nm": 1064.5, "optical_density": 7.5},
                ],
            },
            SHELF["green-alignment"],
        ],
        [],
    ),
    "windows": Filled(
        {
            **PULSED,
            "windows": "3",
            **WINDOW,
            "window_name-2": "Wall",
            "window_distance_m-2": "0",
            "window_distance_m-3": "2.5",
            "window_density-3": "9",
        },
        [],
        [
            DOOR,
            {"name": "Wall", "distance_m": 0},
            {"name": "Window 3", "distance_m": 2.5, "optical_density": 9},
        ],
    ),
    "pulses": Filled(
        {**PULSED, "pairs": "1", "pair_name-1": "Weak", "pair_ranges-1": "1000-1100: DIR LB4 Y"},
        [{"name": "Weak", "ranges": [{"from_nm": 1000, "to_nm": 1100, "marking": "DIR LB4 Y"}]}],
        [],
    ),
    "nothing exceeded": Filled(
        {**CW, "power_w-1": "1e-6", "windows": "1", **WINDOW, "shelf-far-infrared": "1"},
        [SHELF["far-infrared"]],
        [DOOR],
    ),
    "beyond every number": Filled(
        {**CW, "power_w-1": "1e12", "windows": "1", **WINDOW, "shelf-near-infrared": "1"},
        [SHELF["near-infrared"]],
        [DOOR],
    ),
    "as it is": Filled({**CW}, [], []),
}
