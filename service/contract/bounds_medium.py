"""The figures of an unmeasured laser's medium: from the table, replaced by what was given."""

from __future__ import annotations

from service.contract.bounds import BoundsRequest
from service.contract.bounds_result import GainMediumDocument, MediumFigure
from service.contract.problem import FieldError, InvalidRequest
from service.files import DATA
from service.rules.gain_media import QUANTITIES, GainMedium, gain_media

__all__ = ["is_discharge", "media_documents", "medium_of", "refuse"]

WORDS = {
    "levels": "number of levels",
    "lower_ratio": "absorption left in the lower level, over emission",
    "wavelength_nm": "laser wavelength",
    "pump_wavelength_nm": "pump wavelength",
    "lifetime_s": "lifetime of the upper level",
    "cross_section_cm2": "stimulated emission cross-section",
    "density_cm3": "density of active ions",
    "quantum_yield": "laser photons per pump photon, at most",
    "refractive_index": "refractive index",
}
#: Not needed where the table and the request are silent.
SPARE = {"density_cm3", "refractive_index"}


def refuse(field: str, value: object, allowed: str, message: str, remedy: str) -> InvalidRequest:
    """A problem with one field."""
    error = FieldError(field=field, value=value, allowed=allowed, message=message, remedy=remedy)
    return InvalidRequest(f"{field}: {message}", [error])


def media_documents() -> list[GainMediumDocument]:
    """Every medium of the table with its rows and their sources."""
    return [
        GainMediumDocument(
            key=m.key,
            name=m.name,
            host=m.host,
            figures=[_from_table(m, q) for q in QUANTITIES if q in m.rows],
        )
        for m in gain_media(DATA).media.values()
    ]


def is_discharge(request: BoundsRequest, pump_wavelength_nm: float) -> bool:
    """Whether the pump is no beam: shorter than any beam judged here, or that of a gas in the table."""
    medium = gain_media(DATA).media.get(request.medium or "")
    of_table = request.pump_wavelength_nm is None and medium is not None and medium.host == "gas"
    return of_table or pump_wavelength_nm < 180.0


def _from_table(medium: GainMedium, quantity: str) -> MediumFigure:
    row = medium.rows[quantity]
    return MediumFigure(
        quantity=quantity,
        words=WORDS[quantity],
        value=row.value,
        unit=row.unit,
        source=gain_media(DATA).source_text(row),
        known="read" if row.known == "read" else "memory",
    )


def medium_of(request: BoundsRequest) -> dict[str, MediumFigure]:
    """Every figure of the medium by quantity. Raises InvalidRequest where one is missing or impossible."""
    medium = None
    if request.medium is not None:
        media = gain_media(DATA).media
        medium = media.get(request.medium)
        if medium is None:
            raise refuse(
                "medium",
                request.medium,
                ", ".join(media),
                "unknown gain medium",
                "Choose one of those listed.",
            )
    if request.levels == 2:
        raise refuse(
            "levels",
            2,
            "3 or 4",
            "a two-level medium cannot invert: the light that pumps it also empties its upper level, so at "
            "most half of it is excited however hard it is pumped, and it gives no gain",
            "Count the levels again: a medium that lases has three, four or between.",
        )
    found = {}
    for quantity, (unit, _, _) in QUANTITIES.items():
        given = getattr(request, quantity, None)
        if quantity == "lower_ratio" and given is None and request.levels is not None:
            given = 0.0 if request.levels == 4 else 1.0
            if medium is not None and medium.value("levels") == request.levels:
                given = None
        if given is not None:
            found[quantity] = MediumFigure(
                quantity=quantity,
                words=WORDS[quantity],
                value=float(given),
                unit=unit,
                source="",
                known="entered",
            )
        elif medium is not None and quantity in medium.rows:
            found[quantity] = _from_table(medium, quantity)
        elif quantity == "quantum_yield":
            found[quantity] = MediumFigure(
                quantity=quantity, words=WORDS[quantity], value=1.0, unit="1", source="", known="entered"
            )
        elif quantity in SPARE:
            continue
        else:
            raise refuse(
                quantity,
                None,
                "a number",
                f"this figure is missing: {WORDS[quantity]}",
                "Give it, or name a gain medium whose figures are in the table.",
            )
    _check(found)
    return found


def _check(found: dict[str, MediumFigure]) -> None:
    """Refuse what energy or the level scheme forbids."""
    value = {q: f.value for q, f in found.items()}
    ratio, levels = value["lower_ratio"], value["levels"]
    if (levels == 4.0) != (ratio == 0.0):
        raise refuse(
            "lower_ratio",
            ratio,
            "0 with four levels, above 0 to 1 with three",
            "the lower level absorbs with three levels and does not with four",
            "Give levels 3 for a quasi-three-level medium, or leave lower_ratio out.",
        )
    if ratio and value.get("density_cm3") is None:
        raise refuse(
            "density_cm3",
            None,
            "a number",
            "this figure is missing: without it the cost of transparency is unknown",
            "Give the density of active ions.",
        )
    pump, laser, per_photon = value["pump_wavelength_nm"], value["wavelength_nm"], value["quantum_yield"]
    assert pump is not None
    assert laser is not None
    assert per_photon is not None
    if per_photon * pump > laser:
        raise refuse(
            "pump_wavelength_nm",
            pump,
            f"at most {laser / per_photon:g} nm with this quantum yield",
            "the laser would give more energy than it is pumped with",
            "Check both wavelengths; where two pump photons make one laser photon the quantum yield is 0.5.",
        )
