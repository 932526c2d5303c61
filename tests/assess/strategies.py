"""Random requests for property tests: valid over the whole range of the contract."""

from __future__ import annotations

import math
from typing import Any

from hypothesis import strategies as st

from service.contract.request import EvaluationRequest

RULES = ("icnirp-2013", "eu-2006-25", "iec-60825-1-2014", "ansi-z136-1-2014")


def log(low: float, high: float) -> st.SearchStrategy[float]:
    """Numbers spread evenly over the powers of ten."""
    return st.floats(math.log10(low), math.log10(high)).map(lambda x: min(max(10.0**x, low), high))


@st.composite
def emission(draw: st.DrawFn) -> dict[str, Any]:
    mode = draw(st.sampled_from(["cw", "pulse", "train"]))
    if mode == "cw":
        return {"mode": "cw", "power_w": draw(log(1e-6, 1e4))}
    pulse = draw(log(1e-13, 1.0))
    found = {"mode": mode, "energy_j": draw(log(1e-9, 10)), "pulse_s": pulse}
    if mode == "train":
        found["rate_hz"] = min(draw(log(0.01, 1e9)), 1.0 / pulse)
    return found


@st.composite
def line(draw: st.DrawFn, round_only: bool = False, waist: bool = True) -> dict[str, Any]:
    def pair(values: st.SearchStrategy[float]) -> Any:
        return draw(values) if round_only or draw(st.booleans()) else [draw(values), draw(values)]

    return {
        "wavelength_nm": draw(st.one_of(log(180, 1e6), log(180, 3000))),
        "emission": draw(emission()),
        "beam": {
            "profile": draw(st.sampled_from(["gaussian", "tophat"])),
            "level": draw(st.sampled_from(["1/e", "1/e2"])),
            "diameter_mm": pair(log(0.05, 100)),
            "divergence_mrad": pair(log(0.01, 300)),
            "waist_m": draw(st.sampled_from([0.0, 0.0, -1.0, 0.5, 10.0])) if waist else 0.0,
        },
        "subtense_mrad": draw(st.one_of(st.just(1.5), log(0.5, 200))),
    }


@st.composite
def requests(draw: st.DrawFn, lines: int = 3, **kinds: bool) -> EvaluationRequest:
    body: dict[str, Any] = {
        "rules": draw(st.sampled_from(RULES)),
        "lines": draw(st.lists(line(**kinds), min_size=1, max_size=lines)),
    }
    if draw(st.booleans()):
        body["exposure_s"] = draw(log(1e-9, 3e4))
    return EvaluationRequest.model_validate(body)
