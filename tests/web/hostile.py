"""Hostile requests by name: what is sent, the status, and the field that the answer must name."""

from __future__ import annotations

import copy
import json
from collections.abc import AsyncIterator, Callable
from typing import Any, NamedTuple

from tests.web.client import GOOD, JSON, changed

__all__ = ["HOSTILE", "LIMIT", "SURROGATES", "Hostile", "raw", "without"]

#: Largest body that is read unless an operator sets another limit [bytes].
LIMIT = 1_000_000
LINE, EMISSION, BEAM = GOOD["lines"][0], "lines.0.emission", "lines.0.beam"
TRAIN = {"mode": "train", "pulse_s": 1e-8, "rate_hz": 1e3}
TEXT = json.dumps(GOOD)


class Hostile(NamedTuple):
    """A body is sent as it is; a function makes a stream, which has no content-length."""

    name: str
    body: bytes | Callable[[], AsyncIterator[bytes]]
    status: int = 422
    field: str | None = None
    headers: dict[str, str] = JSON


def raw(path: str, text: str) -> bytes:
    """The good request with one value replaced by text, whether JSON or not."""
    return json.dumps(changed(path, "@@")).replace('"@@"', text).encode()


def without(path: str) -> dict[str, Any]:
    """The good request without one field."""
    body = copy.deepcopy(GOOD)
    *way, last = path.split(".")
    place: Any = body
    for step in way:
        place = place[int(step)] if isinstance(place, list) else place[step]
    del place[last]
    return body


async def _flood() -> AsyncIterator[bytes]:
    for _ in range(LIMIT // 50_000 + 1):
        yield b" " * 50_000


def _value(path: str, value: Any, field: str | None = None) -> Hostile:
    shown = json.dumps(value)
    return Hostile(f"{path} = {shown[:90]}", json.dumps(changed(path, value)).encode(), 422, field or path)


def _token(path: str, text: str, status: int = 422) -> Hostile:
    name = text if len(text) < 20 else f"{len(text)} digits"
    return Hostile(f"{path} = {name}", raw(path, text), status, path if status == 422 else None)


def _body(name: str, body: str | bytes, status: int = 400, field: str | None = None) -> Hostile:
    return Hostile(name, body.encode() if isinstance(body, str) else body, status, field)


NUMBERS = ("lines.0.wavelength_nm", f"{EMISSION}.power_w", f"{BEAM}.diameter_mm", "exposure_s")
REQUIRED = (
    *("lines", "lines.0.wavelength_nm", EMISSION, f"{EMISSION}.mode", f"{EMISSION}.power_w"),
    *(BEAM, f"{BEAM}.diameter_mm", f"{BEAM}.divergence_mrad"),
)
TOKENS = (
    "NaN",
    "Infinity",
    "-Infinity",
    "1e400",
    "-1e400",
    "1" + "0" * 400,
    "-1",
    '"532"',
    "true",
    '""',
    "{}",
)

HOSTILE: list[Hostile] = [
    *(_token(path, text) for path in NUMBERS for text in TOKENS),
    *(_token(path, "0") for path in NUMBERS),
    *(_token(path, "null") for path in NUMBERS[:3]),
    _token("lines.0.wavelength_nm", "1" + "0" * 5000),
    _token("lines.0.wavelength_nm", "0.532"),
    _token("lines.0.wavelength_nm", "1000000.1"),
    _token("lines.0.wavelength_nm", "1e-400"),
    _token("exposure_s", "1e5"),
    _value("exposure_s", [0.25]),
    _value(f"{BEAM}.divergence_mrad", -1),
    _value(f"{BEAM}.divergence_mrad", 4000),
    _value(f"{BEAM}.waist_m", 1e7),
    _value(f"{BEAM}.waist_m", None),
    _value("lines.0.subtense_mrad", -0.1),
    _value("viewing", {"distance_m": -1}, "viewing.distance_m"),
    _value("viewing", {"aid": {}}, "viewing.aid.objective_mm"),
    _value("viewing", {"aid": {"objective_mm": 50, "magnification": 0}}, "viewing.aid.magnification"),
    _value("viewing", {"visibility_km": 0}, "viewing.visibility_km"),
    _value("viewing", {"over_distance": {"from_m": 2, "to_m": 1}}, "viewing.over_distance"),
    _value("viewing", []),
    _value("viewing", None),
    _value("bench", [{"element": "space", "length_m": -1}], "bench.0.length_m"),
    _value("bench", [{"element": "lens", "focal_mm": 0}], "bench.0"),
    _value("bench", [{"element": "window"}], "bench.0.transmittance"),
    _value("bench", [{"element": "reflector"}], "bench.0"),
    _value("bench", [{"element": "reflector", "material": "cheese"}], "bench.0"),
    _value("bench", [{"element": "prism"}], "bench.0.element"),
    _value("bench", [{"element": "space", "length_m": 1}] * 33),
    _value("bench", {}),
    *(Hostile(f"missing {p}", json.dumps(without(p)).encode(), 422, p) for p in REQUIRED),
    *(_value(p, 1) for p in ("powr_w", "lines.0.power_w", f"{EMISSION}.x", f"{BEAM}.m2", "viewing.x")),
    *(_value(f"{EMISSION}.mode", m) for m in ("CW", "pulsed", "", None, 1, ["cw"], {})),
    _value(EMISSION, TRAIN),
    _value(EMISSION, {**TRAIN, "energy_j": 1e-6, "average_power_w": 1e-3}),
    _value(EMISSION, {"mode": "cw", "power_w": 1, "energy_j": 1}, f"{EMISSION}.energy_j"),
    _value(EMISSION, {**TRAIN, "energy_j": 1, "power_w": 1}, f"{EMISSION}.power_w"),
    _value(EMISSION, {"mode": "pulse", "energy_j": 1, "pulse_s": 1e-14}, f"{EMISSION}.pulse_s"),
    _value(EMISSION, {**TRAIN, "energy_j": 1, "rate_hz": 0}, f"{EMISSION}.rate_hz"),
    _value(EMISSION, "cw"),
    _value(EMISSION, None),
    _value("lines", []),
    _value("lines", [LINE] * 17),
    _body("10 000 empty lines", json.dumps({"lines": [{}] * 10_000}), 422, "lines"),
    _value("lines", {"0": LINE}),
    _value("lines", None),
    _value("lines", ["532 nm"], "lines.0"),
    _value(f"{BEAM}.diameter_mm", [1, 2, 3]),
    _value(f"{BEAM}.diameter_mm", [1], f"{BEAM}.diameter_mm.1"),
    _value(f"{BEAM}.diameter_mm", []),
    _value(f"{BEAM}.diameter_mm", ["1", "2"], f"{BEAM}.diameter_mm.0"),
    _value(f"{BEAM}.diameter_mm", [1, -1], f"{BEAM}.diameter_mm.1"),
    _value(f"{BEAM}.divergence_mrad", [[1], [2]]),
    _value(f"{BEAM}.level", "1/e3"),
    _value(f"{BEAM}.profile", "fibre_multimode", f"{BEAM}.numerical_aperture"),
    _value(f"{BEAM}.profile", "fibre"),
    _value("rules", "icnirp-1996"),
    _value("rules", ""),
    _value("rules", "x" * 101),
    _value("rules", 2013),
    _value("label", "x" * 201),
    _value("label", None),
    _body("a name twice at the top", TEXT.replace('"label"', '"exposure_s": 1, "label"'), 422, "exposure_s"),
    _body("array at the top", "[]", 422, "body"),
    _body("null at the top", "null", 422, "body"),
    _body("text at the top", '"lines"', 422, "body"),
    _body("empty", b""),
    _body("no JSON", "lines=1&power_w=1"),
    _body("cut off", TEXT[:-20]),
    _body("a raw control character", TEXT.replace("Bench", "\x01")),
    _body("100 000 brackets", b"[" * 100_000),
    _body("100 000 brackets, closed", b"[" * 100_000 + b"]" * 100_000),
    _body("100 000 braces", b'{"lines":' * 100_000),
    _body("deep but readable", b'{"lines":' * 50 + b"1" + b"}" * 50, 422, "lines"),
    _body("invalid UTF-8", TEXT.encode().replace(b"Bench", b"\xff\xfeBench")),
    _body("Latin-1", TEXT.replace("Bench", "Prüfstand").encode("latin-1")),
    _body("UTF-16", TEXT.encode("utf-16")),
    _body("larger than the limit", b" " * (LIMIT + 1), 413),
    Hostile("larger than the limit, without content-length", _flood, 413),
    Hostile("no content type", TEXT.encode(), 415, None, {}),
    Hostile("plain text", TEXT.encode(), 415, None, {"content-type": "text/plain"}),
    Hostile("a form", b"a=1", 415, None, {"content-type": "application/x-www-form-urlencoded"}),
    Hostile("parts", b"--x", 415, None, {"content-type": "multipart/form-data; boundary=x"}),
]

#: Half of a surrogate pair in an escape: JSON allows it, text does not.
LONE = '"\\ud800"'
SURROGATES: list[Hostile] = [
    Hostile("lone surrogate in label", raw("label", LONE), 422, "label"),
    Hostile("lone surrogate in rules", raw("rules", LONE), 422, "rules"),
    Hostile("lone surrogate in mode", raw(f"{EMISSION}.mode", LONE), 422, f"{EMISSION}.mode"),
    Hostile("lone surrogate in level", raw(f"{BEAM}.level", LONE), 422, f"{BEAM}.level"),
    Hostile("lone surrogate as a name", raw("viewing", f"{{{LONE}: 1}}"), 422, None),
]
