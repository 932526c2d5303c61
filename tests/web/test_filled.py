"""The form of a request stands for that request, whatever is in it."""

from __future__ import annotations

from typing import Any
from urllib.parse import parse_qsl

import pytest

from service.contract.request import EvaluationRequest
from service.web.filled import form_of
from service.web.form import Form
from tests.web.client import Client
from tests.web.pages import HTML, as_request
from tests.web.protection_forms import FORMS
from tests.web.test_pages import PULSE, TRAIN, TWO

LINE: dict[str, Any] = {
    "wavelength_nm": 532, "emission": {"mode": "cw", "power_w": 0.1},
    "beam": {"diameter_mm": [2.0, 3.5], "divergence_mrad": 1.0, "waist_m": -0.25, "diameter_at": "exit"},
}  # fmt: skip
FIBRE = {"profile": "fibre_multimode", "numerical_aperture": 0.22, "core_diameter_um": 105}
SINGLE = {"profile": "fibre_single_mode", "mode_field_diameter_um": 6.6}
REQUESTS: dict[str, dict[str, Any]] = {
    **{name: filled.request() for name, filled in FORMS.items()},
    **{name: as_request(f) for name, f in (("train", TRAIN), ("pulse", PULSE), ("two", TWO))},
    "two axes": {"lines": [LINE]},
    "bounds": {"basis": "bound", "lines": [LINE]},
    "fibres": {"lines": [{**LINE, "beam": FIBRE}, {**LINE, "beam": SINGLE}]},
    "open resonator": {"lines": [{**LINE, "output_mirror_reflectance": 0.95}]},
    "every element": {
        "lines": [LINE],
        "bench": [
            {"element": "space", "length_m": 0.3},
            {"element": "lens", "focal_mm": -50, "transmittance": 0.98},
            {"element": "mirror", "radius_mm": 200, "reflectance": 0.9, "incidence_deg": 10},
            {"element": "expander", "magnification": 5},
            {"element": "window", "transmittance": 1e-3},
            {"element": "reflector", "material": "crown glass", "incidence_deg": 45, "surfaces": 2},
            {"element": "reflector", "refractive_index": 1.5, "polarisation": "p", "incidence_deg": 30},
            {"element": "scanner", "angle_deg": 30, "sweeps_hz": 100, "motion": "sinusoidal", "rows": 9,
             "height_deg": 4},
        ],
    },
    "a spot": {"lines": [LINE], "bench": [{"element": "diffuser", "reflectance": 0.8, "viewing_deg": 20}]},
    "viewing": {
        "exposure_s": 2.0, "lines": [LINE],
        "viewing": {"distance_m": 3, "visibility_km": 5, "outdoors": True,
                    "aid": {"objective_mm": 50, "magnification": 7, "transmittance": 0.7}},
    },
}  # fmt: skip


@pytest.mark.parametrize("body", REQUESTS.values(), ids=REQUESTS.keys())
def test_there_and_back(client: Client, body: dict[str, Any]) -> None:
    request = EvaluationRequest.model_validate(body)
    form = form_of(request)
    assert form is not None
    assert Form.read(parse_qsl(form.query())).request() == request
    assert client.get(f"/evaluate?{form.query()}", headers=HTML).status_code == 200


def test_what_the_form_cannot_hold_gives_no_form() -> None:
    over = {"over_distance": {"from_m": 1, "to_m": 10}}
    assert form_of(EvaluationRequest.model_validate({"lines": [LINE], "viewing": over})) is None
    windows = [{"name": " blank before", "distance_m": 1}]
    assert form_of(EvaluationRequest.model_validate({"lines": [LINE], "windows": windows})) is None
