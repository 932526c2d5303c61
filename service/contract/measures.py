"""Control measures: a checklist from class, wavelength and irradiance."""

from __future__ import annotations

from functools import cache
from typing import Any

from service.contract.result import Model
from service.files import DATA
from service.rules.tables import read_toml

__all__ = ["Measure", "Measures", "measures_for"]

ORDER = ("engineering", "administrative", "personal", "other")
REMINDER = (
    "A prompt, not a decision: the local laser safety officer and the local code decide which measures are "
    "needed, and may ask for more."
)


class Measure(Model):
    """One measure, and the kind of document that usually asks for it."""

    id: str
    order: str
    text: str
    asked_by: str


class Measures(Model):
    """The checklist: engineering first, then administrative, then personal, then other hazards."""

    reminder: str
    items: list[Measure]


@cache
def _entries() -> list[tuple[dict[str, Any], Measure]]:
    """Every entry in order, with what is shown of it."""
    entries: list[dict[str, Any]] = read_toml(DATA / "measures.toml")["measure"]
    entries.sort(key=lambda e: ORDER.index(e["order"]))
    return [(e, Measure(**{k: e[k] for k in Measure.model_fields})) for e in entries]


def measures_for(hazard_class: str, wavelengths_nm: list[float], irradiance_w_m2: float) -> Measures:
    """The measures that fit a class, the wavelengths and the highest average irradiance."""

    def fits(entry: dict[str, Any]) -> bool:
        low, high = entry.get("wavelength_from_nm", 0.0), entry.get("wavelength_to_nm", 1e9)
        return (
            hazard_class in entry["classes"]
            and any(low <= w < high for w in wavelengths_nm)
            and irradiance_w_m2 >= entry.get("min_irradiance_w_m2", 0.0)
        )

    items = [measure for entry, measure in _entries() if fits(entry)]
    return Measures(reminder=REMINDER, items=items)
