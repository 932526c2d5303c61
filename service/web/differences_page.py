"""Two rule sets side by side: limits against wavelength and against time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any
from urllib.parse import urlencode

import numpy as np
from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import rule_sets
from service.contract.differences import Differences, Versus, differences, versus
from service.contract.problem import FieldError, InvalidRequest
from service.web.axes import Axis, decades
from service.web.numbers import NotANumber, parse_number, plain, shown_down, shown_up
from service.web.plot import BOTTOM, LEFT, RIGHT, Plot, Reading, curve, mark, top_of
from service.web.present import duration
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(tags=["trust"])

TARGETS = {"eye": "Eye", "skin": "Skin"}
NUMBERS = {
    "wavelength_nm": ("Wavelength", "nm", 180.0, 1e6, "532"),
    "time_s": ("Exposure or pulse duration", "s", 1e-13, 3e4, "0.25"),
    "subtense_mrad": ("Angle of the source", "mrad", 0.0, 3141.0, "1.5"),
}
#: How the place of a known difference is told.
PLACE = {
    "wavelength_nm": "{:g} nm",
    "pulse_s": "pulse of {}",
    "exposure_s": "exposure of {}",
    "rate_hz": "{:g} Hz",
    "subtense_mrad": "source of {:g} mrad",
}
#: Ends of the axes of the charts: the band in which lasers are common, and all times with limits.
BAND_NM, TIMES_S = (180.0, 3000.0), (1e-13, 3e4)
ROWS, READINGS = 24, 101


@dataclass(frozen=True, slots=True)
class Choice:
    """What the page compares."""

    first: str
    second: str
    target: str
    wavelength_nm: float
    time_s: float
    subtense_mrad: float

    def typed(self, name: str) -> str:
        """A number as it stands in its field."""
        return plain(getattr(self, name))


def _error(field: str, value: str, allowed: str, message: str, remedy: str) -> InvalidRequest:
    found = FieldError(field=field, value=value[:100], allowed=allowed, message=message, remedy=remedy)
    return InvalidRequest(f"{field}: {message}", [found])


def _number(given: dict[str, str], name: str) -> float:
    _, unit, low, high, default = NUMBERS[name]
    text, allowed = given.get(name) or default, f"a number, {low:g} to {high:g} {unit}"
    try:
        value = parse_number(text)
    except NotANumber as error:
        raise _error(name, text, allowed, str(error), error.remedy) from None
    if not low <= value <= high:
        raise _error(name, text, allowed, "outside the allowed range", "Check the unit.")
    return value


def _choice(given: dict[str, str]) -> Choice:
    """Raises InvalidRequest on an unknown parameter or a value that cannot be used."""
    sets = list(rule_sets())
    words = {
        "first": (sets, sets[0]),
        "second": (sets, "eu-2006-25"),
        "target": (list(TARGETS), "eye"),
    }
    for name, text in given.items():
        if name not in words and name not in NUMBERS:
            allowed = ", ".join([*words, *NUMBERS])
            raise _error(name[:100], text, allowed, "unknown parameter", "Use the fields of the page.")
    chosen: dict[str, str] = {}
    for name, (allowed_words, default) in words.items():
        chosen[name] = given.get(name) or default
        if chosen[name] not in allowed_words:
            raise _error(name, chosen[name], ", ".join(allowed_words), "unknown value", "Choose one listed.")
    return Choice(
        chosen["first"], chosen["second"], chosen["target"], *(_number(given, name) for name in NUMBERS)
    )


def _words(value: float, along: str) -> str:
    return f"{plain(float(f'{value:.6g}'))} nm" if along == "wavelength" else duration(float(f"{value:.6g}"))


def _plot(found: Versus, along: str, choice: Choice, names: tuple[str, str]) -> Plot:
    ends = BAND_NM if along == "wavelength" else TIMES_S
    x = Axis(*ends, LEFT, RIGHT, along == "time")
    both = np.concatenate([found.first, found.second])
    y = Axis(*decades(float(both.min()) / 1.2, float(both.max()) * 1.2), BOTTOM, top_of(0))
    fixed = duration(choice.time_s) if along == "wavelength" else f"{plain(choice.wavelength_nm)} nm"
    title = f"Limit against {along} at {fixed}, {TARGETS[choice.target].lower()}"
    at = choice.wavelength_nm if along == "wavelength" else choice.time_s
    kinds = zip(("eye", "skin"), names, (found.first, found.second), (0.05, 0.55), strict=True)
    every = max(1, len(found.x) // READINGS)
    readings = [
        Reading(
            x.at(float(found.x[k])),
            f"{_words(float(found.x[k]), along)}: {names[0]} {shown_down(float(found.first[k]))} J/m², "
            f"{names[1]} {shown_down(float(found.second[k]))} J/m²",
            [y.at(float(found.first[k])), y.at(float(found.second[k]))],
        )
        for k in range(0, len(found.x), every)
    ]
    return Plot(
        id=f"by-{along}",
        title=title,
        description=f"{title}. Solid line: {names[0]}. Dashed line: {names[1]}. "
        + _sentence(found, along, names),
        x=x,
        y=y,
        x_title="Wavelength, nm" if along == "wavelength" else "Exposure or pulse duration, s",
        y_title="Strictest limit, J/m²",
        curves=[
            curve(kind, name, x, y, list(zip(found.x.tolist(), values.tolist(), strict=True)), n == 0, part)
            for n, (kind, name, values, part) in enumerate(kinds)
        ],
        marks=[mark(x, at, _words(at, along))] if ends[0] <= at <= ends[1] else [],
        readings=readings,
        reader=f"Read the chart at a {along}",
    )


def _sentence(found: Versus, along: str, names: tuple[str, str]) -> str:
    k = found.widest()
    ratio = float(found.second[k] / found.first[k])
    if found.apart == 0.0:
        return f"The two agree at every {along} shown."
    strict, times = (names[0], ratio) if ratio > 1.0 else (names[1], 1.0 / ratio)
    where = _words(float(found.x[k]), along)
    return f"They differ most at {where}: {strict} is {shown_up(times)} times stricter."


def _rows(found: Versus, along: str) -> list[dict[str, Any]]:
    """A table's worth of points, evenly spread, the widest difference among them."""
    picked = sorted({*np.linspace(0, len(found.x) - 1, ROWS).astype(int).tolist(), found.widest()})
    return [
        {
            "at": _words(float(found.x[k]), along),
            "first": float(found.first[k]),
            "second": float(found.second[k]),
            "ratio": float(found.second[k] / found.first[k]),
        }
        for k in picked
    ]


def _place(ask: dict[str, Any]) -> str:
    """Where a known difference is looked at: 532 nm, pulse of 10 ns."""
    told = {k: duration(v) if k.endswith("_s") else v for k, v in ask.items() if k in PLACE}
    return ", ".join(PLACE[k].format(v) for k, v in told.items())


@router.get("/differences", include_in_schema=False)
async def differences_page(request: Request) -> Response:
    """Known differences, and two rule sets compared on charts."""
    choice = _choice(dict(request.query_params))
    sets = (choice.first, choice.second)
    titles = {key: compiled.rules.title for key, compiled in rule_sets().items()}
    shorts = {k: c.rules.sources[c.rules.document].short for k, c in rule_sets().items()}
    names = (shorts[sets[0]], shorts[sets[1]])
    views = []
    for along, ends, fixed in (
        ("wavelength", BAND_NM, choice.time_s),
        ("time", TIMES_S, choice.wavelength_nm),
    ):
        found = versus(sets, choice.target, along, ends, fixed, choice.subtense_mrad)  # type: ignore[arg-type]
        views.append(
            {
                "plot": _plot(found, along, choice, names),
                "sentence": _sentence(found, along, names),
                "rows": _rows(found, along),
                "along": along,
            }
        )
    return page(
        request,
        "differences.html",
        choice=choice,
        titles=titles,
        shorts=shorts,
        names=names,
        targets=TARGETS,
        numbers=NUMBERS,
        views=views,
        known=differences().differences,
        link=urlencode,
        place=_place,
    )


@router.get("/api/v1/differences", summary="Known differences between the rule sets")
async def get_differences() -> Differences:
    """Each known difference with what every rule set answers at one telling place."""
    return differences()
