"""The working of a class: for each limits the criterion that comes closest, step by step."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from service.assess.classification import Classification
from service.assess.criteria import AVERAGE, RULES, TRAIN_RULE
from service.assess.steps import Step, limit_expression, number
from service.rules.tables import Row

__all__ = ["class_steps", "limiting"]


def limiting(result: Classification, target: str) -> tuple[int, str] | None:
    """Number and condition of the criterion with the worst ratio; None where the limits have no row."""
    table = result.limits[target]
    if not len(table.row):
        return None
    condition = max(table.ratio, key=lambda c: float(table.ratio[c].max()))
    return int(table.ratio[condition].argmax()), condition


def class_steps(result: Classification, target: str) -> Iterator[Step]:
    """Time base, factors, limit, aperture, accessible emission and ratio of the limiting criterion."""
    where = limiting(result, target)
    if where is not None:
        yield from _Level(result, target, *where).steps()


class _Level:
    """The limiting criterion `k` of the limits `target` under a measurement condition."""

    def __init__(self, result: Classification, target: str, k: int, condition: str) -> None:
        self.result, self.target, self.k, self.condition = result, target, k, condition
        self.scheme, self.published = result.scheme, result.scheme.scheme
        self.table = result.limits[target]
        self.found = self.table.exposures
        self.e, self.line = int(self.table.exposure[k]), int(self.table.line[k])
        self.row = self.published.limits[self.table.row[k]]
        self.unit = "J/m2" if self.scheme.per_area[self.table.row[k]] else "J"

    def step(
        self, symbol: str, text: str, value: float, unit: str, row: Row | None = None, known: str = "computed"
    ) -> Step:
        """A step of this level, with the source of a row where it rests on one."""
        source = "" if row is None else self.published.source_text(row.source, row.locator)
        if row is not None and row.note:
            source += f"; {row.note}"
        return Step(symbol, text, value, unit, source, known if row is None else row.known, line=self.line)

    def steps(self) -> Iterator[Step]:
        """All steps in order."""
        target, row, rule = self.target, self.row, int(self.found.rule[self.e])
        base = self.scheme.time_base_row(target, float(self.result.lines.wavelength_nm[self.line]))
        yield self.step("T", f"time base of the limits of Class {target}", base.duration_s, "s", base)
        yield from self._factors()
        at = number(float(self.found.time_s[self.e]))
        expression = limit_expression(row.coefficient, row.time_power, row.factors, at)
        unit = {"P": "W", "E": "W/m2", "Q": "J", "H": "J/m2"}[row.quantity]
        if row.quantity in "PE":
            expression = f"({expression}) {unit} x {at} s"
        if row.cap is not None:
            expression += f", at most {row.cap:g} {unit}"
        text = f"Class {target}: limit of row {row.row} at {at} s, rule {RULES[rule]}: {expression}"
        limit = float(self.table.limit[self.k])
        yield self.step(f"AEL_{target}", text, limit / float(self.found.share[self.e]), self.unit, row)
        if rule == AVERAGE:
            count = number(float(self.found.count[self.e]))
            yield self.step(
                f"AEL_{target} per pulse", f"share of one pulse: / {count} pulses", limit, self.unit
            )
        elif rule == TRAIN_RULE:
            yield from self._train(limit)
        yield from self._emission(limit)

    def _factors(self) -> Iterator[Step]:
        """Every factor of the limit with its value."""
        line = np.array([self.line])
        time = self.found.time_s[self.e : self.e + 1]
        for name in dict.fromkeys(token.partition("^")[0] for token in self.row.factors.split()):
            value = float(self.scheme.value(name, self.result.conditions, line, time)[0])
            text = self.scheme.factor_text(name, self.result.conditions, self.line, float(time[0]))
            factor = self.scheme.factors.get(name)
            unit = "1" if factor is None else factor.unit
            source = self.scheme.factor_row(name, self.result.conditions, self.line, float(time[0]))
            if isinstance(source, Row):
                yield self.step(name, text, value, unit, source)
            else:
                place = self.published.source_text(source.source, source.locator)
                yield Step(name, text, value, unit, place, source.known, line=self.line)

    def _train(self, limit: float) -> Iterator[Step]:
        count, grouped = float(self.found.count[self.e]), float(self.found.grouped_s[self.e])
        symbol, shared = self.published.repetition_symbol, ""
        if grouped:
            pulses = float(self.result.lines.rate_hz[self.line]) * grouped
            shared = f" / {number(pulses)} pulses in a group"
        row = self.scheme.repetition.rows[int(self.found.c_p_row[self.e])]
        floor = f", at least {row.floor:g}" if row.floor else ""
        expression = limit_expression(row.coefficient, row.count_power, "", "N")
        text = f"row {row.row}: {expression}{floor}, at most 1, with N = {number(count)} pulses or groups"
        yield self.step(symbol, text, float(self.found.c_p[self.e]), "1", row)
        text = f"one pulse: AEL x {symbol}{shared}"
        yield self.step(f"AEL_{self.target} per pulse", text, limit, self.unit)

    def _emission(self, limit: float) -> Iterator[Step]:
        """Aperture, accessible emission, ratio, and the sum where lines add."""
        table, k = self.table, self.k
        measured = self.published.measurement[int(table.measured[self.condition][k])]
        time = float(self.found.aperture_s[self.e])
        aperture = limit_expression(measured.coefficient_mm, measured.time_power, "", number(time))
        diameter = measured.coefficient_mm * time**measured.time_power
        waist = float(self.result.lines.beams.last_waist_m()[self.line])
        place = max(measured.distance_m, waist)
        text = f"condition {measured.condition}: aperture {aperture} mm at {number(place)} m from the exit"
        if waist > measured.distance_m:
            text += f", the waist, which lies beyond the {measured.distance_m:g} m of the condition"
        yield self.step("a", text, diameter, "mm", measured)
        emission, dose = float(table.emission[self.condition][k]), float(self.found.dose[self.e])
        area = np.pi / 4.0 * (diameter * 1e-3) ** 2 if self.unit == "J/m2" else 1.0
        inside = number(emission * area / dose)
        text = f"accessible emission: {number(dose)} J x {inside} (fraction through the aperture)"
        yield self.step("AE", text + (" / its area" if self.unit == "J/m2" else ""), emission, self.unit)
        ratio = float(table.ratio[self.condition][k])
        yield self.step(f"AE / AEL_{self.target}", f"{number(emission)} / {number(limit)}", ratio, "1")
        whole = max(float(r[0]) for r in self.result.ratio[self.target].values())
        if whole != ratio:
            text = f"Class {self.target}: lines added, or judged by the limits fallen back on"
            yield self.step("sum", text, whole, "1")
