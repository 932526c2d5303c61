"""The working of a class: for each limits the criterion that comes closest, step by step."""

from __future__ import annotations

from collections.abc import Iterator

from service.assess.classification import Classification
from service.assess.criteria import AVERAGE, RULES, TRAIN_RULE
from service.assess.steps import Step, limit_expression, number
from service.rules.classes import ClassScheme
from service.rules.tables import Row

__all__ = ["class_steps", "limiting"]


def limiting(result: Classification, target: str) -> tuple[int, str] | None:
    """Number and condition of the criterion with the worst ratio; None where the limits have no row."""
    table = result.limits[target]
    if not len(table.row):
        return None
    worst = max(
        ((c, int(r.argmax())) for c, r in table.ratio.items()), key=lambda p: float(table.ratio[p[0]][p[1]])
    )
    return worst[1], worst[0]


def _source(scheme: ClassScheme, row: Row) -> str:
    """Document, place and note of a row."""
    text = scheme.source_text(row.source, row.locator)
    return f"{text}; {row.note}" if row.note else text


def class_steps(result: Classification, target: str) -> Iterator[Step]:
    """Time base, limit, aperture, accessible emission and ratio of the limiting criterion."""
    where = limiting(result, target)
    if where is None:
        return
    k, condition = where
    table, scheme, published = result.limits[target], result.scheme, result.scheme.scheme
    e, line = int(table.exposure[k]), int(table.line[k])
    row, rule = published.limits[table.row[k]], int(table.exposures.rule[e])
    time, share = float(table.exposures.time_s[e]), float(table.exposures.share[e])
    unit = "J/m2" if scheme.per_area[table.row[k]] else "J"

    def step(
        symbol: str, text: str, value: float, unit: str, source: str = "", known: str = "computed"
    ) -> Step:
        return Step(symbol, text, value, unit, source, known, line=line)

    wavelength = float(result.lines.wavelength_nm[line])
    for base in published.time_bases:
        if base.target == target and base.wavelength_from_nm <= wavelength <= base.wavelength_to_nm:
            source = published.source_text(base.source, base.locator) + (
                f"; {base.note}" if base.note else ""
            )
            yield step(
                "T", f"time base of the limits of Class {target}", base.duration_s, "s", source, base.known
            )
            break
    at = number(time)
    expression = limit_expression(row.coefficient, row.time_power, row.factors, at)
    if row.quantity in "PE":
        expression = f"({expression}) {'W' if row.quantity == 'P' else 'W/m2'} x {at} s"
    text = f"Class {target}: limit of row {row.row} at {at} s, rule {RULES[rule]}: {expression}"
    yield step(f"AEL_{target}", text, float(table.limit[k]) / share, unit, _source(published, row), row.known)
    if rule in (AVERAGE, TRAIN_RULE):
        count, c_p = float(table.exposures.count[e]), float(table.exposures.c_p[e])
        text = f"share of one pulse: / {number(count)} pulses"
        if rule == TRAIN_RULE:
            factor = f"{published.repetition_symbol} = {number(c_p)}"
            text = f"one pulse: x {factor} for {number(count)} pulses or groups"
        yield step(f"AEL_{target} per pulse", text, float(table.limit[k]), unit)
    measured = published.measurement[int(table.measured[condition][k])]
    at = number(float(table.exposures.aperture_s[e]))
    aperture = limit_expression(measured.coefficient_mm, measured.time_power, "", at)
    yield step(
        "a",
        f"condition {measured.condition}: aperture {aperture} mm at {measured.distance_m:g} m from the exit",
        measured.coefficient_mm * float(table.exposures.aperture_s[e]) ** measured.time_power,
        "mm",
        _source(published, measured),
        measured.known,
    )
    emission = float(table.emission[condition][k])
    dose = number(float(table.exposures.dose[e]))
    area = " / its area" if unit == "J/m2" else ""
    text = f"accessible emission: {dose} J x the fraction through the aperture{area}"
    yield step("AE", text, emission, unit)
    ratio = float(table.ratio[condition][k])
    yield step(f"AE / AEL_{target}", f"{number(emission)} / {number(float(table.limit[k]))}", ratio, "1")
    whole = max(float(r[0]) for r in result.ratio[target].values())
    if whole != ratio:
        yield step("sum", f"Class {target}: lines added, or judged by the limits fallen back on", whole, "1")
