"""A stored request as the address of the evaluation page."""

from __future__ import annotations

from urllib.parse import parse_qsl, quote, urlencode

from service.contract.problem import Problem
from service.contract.request import EvaluationRequest
from service.web.fields import ADDRESS_VERSION, BEAM_NUMBERS, EMISSION_NUMBERS, field_name
from service.web.form import Form
from service.web.numbers import plain

__all__ = ["evaluate_address", "ranges_text", "request_of_query"]

AXES = {"diameter_y_mm": "diameter_mm", "divergence_y_mrad": "divergence_mrad"}


def request_of_query(query: str) -> EvaluationRequest:
    """The request of an address of the evaluation page. Raises BadAddress, InvalidRequest."""
    return Form.read(parse_qsl(query, keep_blank_values=True, max_num_fields=400)).request()


def evaluate_address(request: EvaluationRequest) -> str | None:
    """The address that evaluates just this request; None where the form cannot hold it."""
    query = urlencode(_fields(request), quote_via=quote)
    try:
        same = request_of_query(query) == request
    except (Problem, ValueError):
        same = False
    return f"/evaluate?{query}" if same else None


def _fields(request: EvaluationRequest) -> dict[str, str]:
    found = {"v": ADDRESS_VERSION, "label": request.label, "rules": request.rules}
    found["exposure_s"] = _number(request.exposure_s)
    found["distance_m"] = _number(request.viewing.distance_m)
    found["lines"] = str(len(request.lines))
    for k, line in enumerate(request.lines, start=1):
        emission = line.emission.model_dump(exclude_none=True)
        beam = line.beam.model_dump(mode="json")
        values: dict[str, str] = {"wavelength_nm": plain(line.wavelength_nm), "mode": line.emission.mode}
        values |= {n: _number(emission.get(n)) for n in EMISSION_NUMBERS}
        for name in BEAM_NUMBERS:
            given = beam.get(AXES.get(name, name))
            if isinstance(given, list):
                values[name] = plain(given[1 if name in AXES else 0])
            elif name not in AXES:
                values[name] = _number(given)
        values |= {n: str(beam[n]) for n in ("profile", "level", "diameter_at") if n in beam}
        values["subtense_mrad"] = plain(line.subtense_mrad)
        found |= {field_name(n, k): v for n, v in values.items()}
    if request.eyewear:
        found["pairs"] = str(len(request.eyewear))
    for k, pair in enumerate(request.eyewear, start=1):
        found[field_name("pair_name", k)] = pair.name
        found[field_name("pair_ranges", k)] = ranges_text(pair.model_dump(exclude_none=True)["ranges"])
        light = pair.luminous_transmittance
        found[field_name("pair_light_percent", k)] = "" if light is None else plain(light * 100.0)
    if request.windows:
        found["windows"] = str(len(request.windows))
    for k, window in enumerate(request.windows, start=1):
        found[field_name("window_name", k)] = window.name
        found[field_name("window_distance_m", k)] = plain(window.distance_m)
        found[field_name("window_density", k)] = _number(window.optical_density)
    return {k: v for k, v in found.items() if v}


def _number(value: float | None) -> str:
    return "" if value is None else plain(value)


def ranges_text(ranges: list[dict[str, object]]) -> str:
    """Ranges of a pair as the form takes them: 780-1100: OD 7 | D LB6 + IR LB7; 532: OD 5."""
    parts = []
    for r in ranges:
        low, high = float(str(r["from_nm"])), float(str(r["to_nm"]))
        items = []
        if r.get("optical_density") is not None:
            items.append(f"OD {plain(float(str(r['optical_density'])))}")
        if r.get("marking"):
            items.append(str(r["marking"]))
        band = plain(low) if low == high else f"{plain(low)}-{plain(high)}"
        parts.append(f"{band}: {' | '.join(items)}")
    return "; ".join(parts)
