"""The CSV form of the register: its columns, and lasers as rows.

One row is one laser. A setup with one emission line stands in columns, the unit in each name; any
other stands as JSON in the last column. Result columns are written and ignored when read.
"""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterator, Mapping
from typing import Any

import sqlalchemy as sa

from service.contract.request import EvaluationRequest
from service.register.database import Database
from service.register.figures import canonical
from service.register.listing import Filters
from service.register.schema import lasers, revisions
from service.web.numbers import plain

__all__ = [
    "COLUMNS",
    "IDENTITY",
    "NUMBERS",
    "RESULTS",
    "SETUP",
    "WORDS",
    "exported",
    "guarded",
    "request_of",
    "unguarded",
]

#: Column and what it holds, in the order of the file.
COLUMNS: dict[str, str] = {
    "asset_tag": "inventory number, unique; a known one changes that laser",
    "label": "name of the laser",
    "place": "building and room",
    "owner": "who answers for it",
    "manufacturer": "maker and type",
    "review_due": "next review, YYYY-MM-DD",
    "rules": "rule set id; blank: the default",
    "exposure_s": "exposure duration in s; blank: the conventional one",
    "wavelength_nm": "wavelength in nm",
    "mode": "cw, pulse or train",
    "power_w": "cw: power in W",
    "energy_j": "pulse, train: energy of one pulse in J",
    "average_power_w": "train: average power in W instead of the energy",
    "pulse_s": "pulse, train: pulse duration in s",
    "rate_hz": "train: repetition rate in Hz",
    "profile": "gaussian or tophat; blank: gaussian",
    "diameter_mm": "beam diameter in mm",
    "diameter_y_mm": "other axis of an elliptical beam, in mm",
    "divergence_mrad": "full-angle divergence in mrad",
    "divergence_y_mrad": "other axis, in mrad",
    "level": "1/e2 or 1/e; blank: 1/e2",
    "waist_m": "waist position in m, + downstream; blank: at the exit",
    "diameter_at": "waist or exit; blank: waist",
    "subtense_mrad": "angular subtense of the apparent source in mrad; blank: 1.5",
    "distance_m": "viewing distance in m",
    "request_json": "the whole request as JSON instead of the columns from rules on",
}
RESULTS: dict[str, str] = {
    "status": "draft, submitted, approved or retired",
    "revision": "number of the current revision",
    "approved_revision": "number of the revision in force",
    "hazard_class": "class under the default scheme",
    "eye_hazard_distance_m": "in m; blank: unbounded",
    "skin_hazard_distance_m": "in m; blank: unbounded",
    "optical_density": "needed at the most hazardous place",
    "updated_at": "last change, UTC",
}
IDENTITY = ("asset_tag", "label", "place", "owner", "manufacturer", "review_due")
EMISSION = ("mode", "power_w", "energy_j", "average_power_w", "pulse_s", "rate_hz")
BEAM = ("profile", "diameter_mm", "divergence_mrad", "level", "waist_m", "diameter_at")
WORDS = ("rules", "mode", "profile", "level", "diameter_at")
SETUP = tuple(c for c in COLUMNS if c not in IDENTITY and c != "request_json")
NUMBERS = tuple(c for c in SETUP if c not in WORDS)
#: Spreadsheets take text that starts so for a formula.
FORMULA = ("=", "+", "-", "@", "\t", "\r")


def guarded(text: str) -> str:
    """Text that no spreadsheet takes for a formula: an apostrophe stands before what could be one."""
    return f"'{text}" if text.lstrip("'").startswith(FORMULA) else text


def unguarded(text: str) -> str:
    """The text before `guarded`."""
    return text[1:] if text.startswith("'") and text.lstrip("'").startswith(FORMULA) else text


def request_of(cells: Mapping[str, Any], label: str) -> dict[str, Any]:
    """The body of a request from the values of the setup columns that are not blank."""
    given = {k: v for k, v in cells.items() if v is not None}
    beam = {k: given[k] for k in BEAM if k in given}
    for name, other in (("diameter_mm", "diameter_y_mm"), ("divergence_mrad", "divergence_y_mrad")):
        if other in given:
            beam[name] = [given.get(name), given[other]]
    line: dict[str, Any] = {k: given[k] for k in ("wavelength_nm", "subtense_mrad") if k in given}
    line |= {"emission": {k: given[k] for k in EMISSION if k in given}, "beam": beam}
    body: dict[str, Any] = {"label": label, "lines": [line]}
    body |= {k: given[k] for k in ("rules", "exposure_s") if k in given}
    if "distance_m" in given:
        body["viewing"] = {"distance_m": given["distance_m"]}
    return body


def _cells(request: EvaluationRequest) -> dict[str, Any] | None:
    """The setup columns of a request; None where they cannot hold it."""
    line = request.lines[0]
    emission = line.emission.model_dump(exclude_none=True)
    beam = line.beam.model_dump(mode="json", exclude_none=True)
    found: dict[str, Any] = {"rules": request.rules, "exposure_s": request.exposure_s}
    found |= {k: emission.get(k) for k in EMISSION} | {k: beam.get(k) for k in BEAM}
    for name, other in (("diameter_mm", "diameter_y_mm"), ("divergence_mrad", "divergence_y_mrad")):
        if isinstance(found[name], list):
            found[name], found[other] = found[name]
    found |= {"wavelength_nm": line.wavelength_nm, "subtense_mrad": line.subtense_mrad}
    found["distance_m"] = request.viewing.distance_m
    try:
        same = EvaluationRequest.model_validate(request_of(found, request.label)) == request
    except ValueError:
        same = False
    return found if same else None


def _text(value: Any) -> str:
    if value is None:
        return ""
    return plain(value) if isinstance(value, float) else str(value)


def exported(database: Database, filters: Filters) -> Iterator[str]:
    """The register as CSV, a line at a time: the lasers that the filters name, in their order."""
    names = [*COLUMNS, *RESULTS]
    buffer = io.StringIO()
    writer = csv.DictWriter(buffer, names, restval="", lineterminator="\r\n")
    writer.writeheader()
    current = sa.and_(revisions.c.laser_id == lasers.c.id, revisions.c.number == lasers.c.revision)
    with database.read() as connection:
        query = (
            sa.select(lasers, revisions.c.request)
            .join(revisions, current)
            .where(*filters.conditions())
            .order_by(*filters.order())
        )
        for row in connection.execution_options(yield_per=500).execute(query).mappings():
            writer.writerow(_row(dict(row)))
            if buffer.tell() > 60_000:
                yield buffer.getvalue()
                buffer.seek(0)
                buffer.truncate()
    yield buffer.getvalue()


def _row(row: Mapping[str, Any]) -> dict[str, str]:
    request = EvaluationRequest.model_validate(json.loads(row["request"]))
    request = request.model_copy(update={"label": row["label"]})
    found = {k: guarded(_text(row[k])) for k in IDENTITY}
    cells = _cells(request)
    if cells is None:
        found["request_json"] = canonical(request.model_dump(mode="json", exclude_none=True))
    else:
        found |= {k: _text(v) for k, v in cells.items()}
    found |= {
        k: _text(row[k])
        for k in ("status", "revision", "approved_revision", "hazard_class", "optical_density", "updated_at")
    }
    found["eye_hazard_distance_m"] = _text(row["eye_distance_m"])
    found["skin_hazard_distance_m"] = _text(row["skin_distance_m"])
    return found
