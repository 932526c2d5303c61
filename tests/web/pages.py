"""Addresses of pages: how the checks of this folder fill the form in."""

from __future__ import annotations

from typing import Any
from urllib.parse import quote, urlencode

from tests.web.client import Client
from tests.web.markup import Element, parse

__all__ = ["CW", "HTML", "address", "as_request", "page"]

HTML = {"accept": "text/html,application/xhtml+xml"}
#: The example of contract v1 as form fields, in the order of the form.
CW = {
    "label": "Bench 4 alignment beam",
    "exposure_s": "0.25",
    "lines": "1",
    "wavelength_nm-1": "532",
    "mode-1": "cw",
    "power_w-1": "0.1",
    "diameter_mm-1": "2",
    "divergence_mrad-1": "1",
}


def address(fields: dict[str, str], **more: str) -> str:
    return "/evaluate?" + urlencode({"v": "1", **fields, **more}, quote_via=quote)


def page(client: Client, url: str, status: int = 200) -> Element:
    """The page at an address after at most one redirect."""
    response = client.get(url, headers=HTML)
    if response.status_code == 303:
        response = client.get(response.headers["location"], headers=HTML)
    assert response.status_code == status, (response.status_code, response.headers, response.text[:200])
    assert response.headers["content-type"] == "text/html; charset=utf-8"
    return parse(response.text)


def as_request(fields: dict[str, str]) -> dict[str, Any]:
    """The body of the API call that the form fields stand for."""
    body: dict[str, Any] = {"lines": []}
    for n in range(1, int(fields.get("lines", "1")) + 1):
        line: dict[str, Any] = {"emission": {"mode": fields[f"mode-{n}"]}, "beam": {}}
        for name in ("wavelength_nm", "subtense_mrad"):
            if f"{name}-{n}" in fields:
                line[name] = float(fields[f"{name}-{n}"])
        for name in ("power_w", "energy_j", "average_power_w", "pulse_s", "rate_hz"):
            if f"{name}-{n}" in fields:
                line["emission"][name] = float(fields[f"{name}-{n}"])
        for name, other in (("diameter_mm", "diameter_y_mm"), ("divergence_mrad", "divergence_y_mrad")):
            first = float(fields[f"{name}-{n}"])
            second = fields.get(f"{other}-{n}")
            line["beam"][name] = first if second is None else [first, float(second)]
        for name in ("profile", "level"):
            if f"{name}-{n}" in fields:
                line["beam"][name] = fields[f"{name}-{n}"]
        if f"waist_m-{n}" in fields:
            line["beam"]["waist_m"] = float(fields[f"waist_m-{n}"])
        body["lines"].append(line)
    for name in ("label", "rules"):
        if name in fields:
            body[name] = fields[name]
    if "exposure_s" in fields:
        body["exposure_s"] = float(fields["exposure_s"])
    if "distance_m" in fields:
        body["viewing"] = {"distance_m": float(fields["distance_m"])}
    return body
