"""Hostile pairs and windows: what is sent, the field that is named, and what the reason must say."""

from __future__ import annotations

import copy
import json
from typing import Any, NamedTuple

from tests.web.client import GOOD, changed

__all__ = ["PAIRS", "START", "UNREADABLE", "WINDOWS", "Wrong", "sent", "unreadable"]

RANGE = {"from_nm": 500, "to_nm": 560, "optical_density": 6, "marking": "D LB6"}
PAIR = {"name": "Pair", "ranges": [RANGE], "luminous_transmittance": 0.5}
WINDOW = {"name": "Wall", "distance_m": 2, "optical_density": 3}
START: dict[str, Any] = {**GOOD, "eyewear": [PAIR], "windows": [WINDOW]}
E, R, W = "eyewear.0", "eyewear.0.ranges.0", "windows.0"


class Wrong(NamedTuple):
    """One wrong value, the field that must be named, words of message and of what is allowed."""

    path: str
    value: Any
    field: str
    message: str = ""
    allowed: str = ""

    def __str__(self) -> str:
        shown = "missing" if self.value is ... else json.dumps(self.value)
        return f"{self.path} = {shown if len(shown) < 60 else f'{shown[:60]}, {len(shown)} characters'}"


def sent(wrong: Wrong) -> bytes:
    """The good request with one value wrong; the value ... takes the field away."""
    if wrong.value is not ...:
        return json.dumps(changed(wrong.path, wrong.value, START)).encode()
    body = copy.deepcopy(START)
    *way, last = wrong.path.split(".")
    place: Any = body
    for step in way:
        place = place[int(step)] if isinstance(place, list) else place[step]
    del place[last]
    return json.dumps(body).encode()


def at(path: str, value: Any, message: str = "", allowed: str = "", field: str | None = None) -> Wrong:
    return Wrong(path, value, field or path, message, allowed)


OUTSIDE, UNKNOWN, MISSING = "outside the allowed range", "unknown field", "missing"
WAVELENGTHS, DENSITIES, SHARE = "180 to 1e+06 nm", "0 to 20", "above 0 to 1"
TEXT_OF_200 = "text of at most 200"

PAIRS = [
    *(at("eyewear", v, "not a list", "a list of 0 to 20") for v in ({}, "goggles", 1, True, None)),
    at("eyewear", [PAIR] * 21, "20", "a list of 0 to 20"),
    *(at("eyewear", [v], "not a JSON object", "an object", E) for v in ("goggles", 1, None, [PAIR])),
    at("eyewear", [PAIR, {}], MISSING, "", "eyewear.1.name"),
    at(f"{E}.name", ..., MISSING, TEXT_OF_200),
    at(f"{E}.name", "", "", TEXT_OF_200),
    *(at(f"{E}.name", v, "", TEXT_OF_200) for v in ("x" * 201, 7, None, ["a"], {})),
    at(f"{E}.ranges", ..., MISSING, "a list of 1 to 20"),
    at(f"{E}.ranges", [], "", "a list of 1 to 20"),
    at(f"{E}.ranges", [RANGE] * 21, "20", "a list of 1 to 20"),
    *(at(f"{E}.ranges", v, "not a list", "a list of 1 to 20") for v in (RANGE, "532: OD 5", None)),
    *(at(f"{E}.ranges", [v], "not a JSON object", "an object", R) for v in ("532: OD 5", 532, None)),
    *(at(f"{E}.luminous_transmittance", v, OUTSIDE, SHARE) for v in (0, -0.1, 1.01, 62)),
    *(at(f"{E}.luminous_transmittance", v, "", SHARE) for v in ("0.5", True, [0.5])),
    *(at(f"{E}.{n}", 1, UNKNOWN, "no such field") for n in ("colour", "optical_density", "marking")),
    at(f"{R}.from_nm", ..., MISSING, WAVELENGTHS),
    at(f"{R}.to_nm", ..., MISSING, WAVELENGTHS),
    *(at(f"{R}.from_nm", v, OUTSIDE, WAVELENGTHS) for v in (0, -532, 0.532, 179.9, 1.1e6)),
    *(at(f"{R}.to_nm", v, "", WAVELENGTHS) for v in ("560", None, True, {})),
    at(f"{R}.to_nm", 499, "below", "", R),
    *(at(f"{R}.optical_density", v, OUTSIDE, DENSITIES) for v in (-0.1, 20.1, 1e300)),
    *(at(f"{R}.optical_density", v, "", DENSITIES) for v in ("6", True, [6])),
    at(f"{E}.ranges", [{"from_nm": 500, "to_nm": 560}], "optical_density, marking, or both", "", R),
    *(at(f"{R}.{n}", 1, UNKNOWN, "no such field") for n in ("od", "lb", "wavelength_nm")),
    *(at(f"{R}.marking", v, "", "text") for v in (6, ["D LB6"], {}, True, "D LB6 " + " " * 200)),
    at(f"{R}.marking", "", "empty", "text"),
    at(f"{R}.marking", "goggles", "LB1 to LB10", "text"),
    at(f"{R}.marking", "D L6", "older edition", "text"),
    at(f"{R}.marking", "D LB11", "LB1 to LB10", "text"),
    at(f"{R}.marking", "RB6", "RB1 to RB5", "text"),
    at(f"{R}.marking", "DX LB6", "X is no mode", "text"),
    at(f"{R}.marking", "D LB6 + D LB5", "twice", "text"),
    at(f"{R}.marking", "560-500 D LB6", "low to high", "text"),
    at(f"{R}.marking", "D LB6 +", "plus", "text"),
    at(f"{R}.marking", "D LB" + "9" * 190, "LB1 to LB10", "text"),
]
WINDOWS = [
    *(at("windows", v, "not a list", "a list of 0 to 20") for v in ({}, "wall", 1, None)),
    at("windows", [WINDOW] * 21, "20", "a list of 0 to 20"),
    *(at("windows", [v], "not a JSON object", "an object", W) for v in ("wall", 2, None, [WINDOW])),
    at(f"{W}.name", ..., MISSING, TEXT_OF_200),
    *(at(f"{W}.name", v, "", TEXT_OF_200) for v in ("", "x" * 201, 1, None)),
    at(f"{W}.distance_m", ..., MISSING, "0 to 1e+09 m"),
    *(at(f"{W}.distance_m", v, OUTSIDE, "0 to 1e+09 m") for v in (-1e-9, -1, 1.1e9)),
    *(at(f"{W}.distance_m", v, "", "0 to 1e+09 m") for v in ("2", None, True, [2])),
    *(at(f"{W}.optical_density", v, OUTSIDE, DENSITIES) for v in (-1, 20.1)),
    *(at(f"{W}.optical_density", v, "", DENSITIES) for v in ("3", False, {})),
    *(at(f"{W}.{n}", 1, UNKNOWN, "no such field") for n in ("ranges", "marking", "transmittance")),
]
#: Numbers that are no JSON, or too large for it: the text in the place of the value, and the field.
UNREADABLE = [
    (path, text)
    for path in (
        *(f"{R}.from_nm", f"{R}.optical_density", f"{E}.luminous_transmittance"),
        *(f"{W}.distance_m", f"{W}.optical_density"),
    )
    for text in ("NaN", "Infinity", "-Infinity", "1e400", "1" + "0" * 400)
]


def unreadable(path: str, text: str) -> bytes:
    """The good request with a value replaced by text."""
    return json.dumps(changed(path, "@@", START)).replace('"@@"', text).encode()
