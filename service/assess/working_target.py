"""The working for the eye or the skin: limits, exposures, the verdict and the distance."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from service.assess.criteria import AVERAGE, RULES, TRAIN_RULE
from service.assess.evaluate import Evaluation, optical_density
from service.assess.lines import CW
from service.assess.steps import Step, limit_expression, number
from service.rules.grid import SMALL_SOURCE_MRAD
from service.rules.tables import LimitRow

__all__ = ["target_steps"]


def target_steps(evaluation: Evaluation, laser: int, target: str, first_line: int) -> Iterator[Step]:
    """Steps of one laser for `target`; lines are counted from `first_line`."""
    result = evaluation.target(target)
    members = np.flatnonzero(evaluation.lines.laser[result.criteria.line] == laser)
    for local, k in enumerate(members):
        yield from _Criterion(evaluation, target, int(k), local, first_line).steps()
    yield from _verdict(evaluation, target, laser, [int(k) for k in members])
    yield from _distance(evaluation, target, laser, [int(k) for k in members], first_line)


class _Criterion:
    """Steps of one criterion: number `k` of the batch, `local` within its laser and target."""

    def __init__(self, evaluation: Evaluation, target: str, k: int, local: int, first_line: int) -> None:
        self.evaluation, self.rules, self.published = evaluation, evaluation.rules, evaluation.rules.rules
        self.result = evaluation.target(target)
        self.criteria, self.found = self.result.criteria, evaluation.exposures
        self.k, self.e, self.line = k, int(self.criteria.exposure[k]), int(self.criteria.line[k])
        self.row: LimitRow = self.published.limits[self.criteria.row[k]]
        self.place = {"line": self.line - first_line, "criterion": local}
        self.target = target

    def step(
        self, symbol: str, text: str, value: float, unit: str, source: str = "", known: str = "computed"
    ) -> Step:
        """A step of this criterion."""
        return Step(symbol, text, value, unit, source, known, target=self.target, **self.place)

    def source(self, key: str, locator: str, note: str = "") -> str:
        """Document, place and note of a row."""
        return self.published.source_text(key, locator) + (f"; {note}" if note else "")

    def steps(self) -> Iterator[Step]:
        """Factors of time, limit, share of a pulse, aperture, exposure, ratio."""
        time, row = float(self.found.time_s[self.e]), self.row
        yield from self._time_factors()
        expression = limit_expression(row.coefficient, row.time_power, row.factors, number(time))
        unit = "J/m2"
        if row.quantity == "E":
            expression, unit = f"({expression}) W/m2 x {number(time)} s", "W/m2"
        if row.cap is not None:
            expression += f", at most {row.cap:g} {unit}"
        limit = float(self.criteria.limit_j_m2[self.k])
        yield self.step(
            "H_MPE",
            f"limit of row {row.row} ({row.tissue}, {row.effect}) at {number(time)} s: {expression}",
            limit / float(self.found.share[self.e]),
            "J/m2",
            self.source(row.source, row.locator, row.note),
            row.known,
        )
        rule = int(self.found.rule[self.e])
        if rule == AVERAGE:
            yield from self._average_steps(limit)
        elif rule == TRAIN_RULE:
            yield from self._train_steps(limit)
        yield self._aperture()
        ratio, strength = float(self.result.hazard_ratio[self.k]), float(self.criteria.strength[self.k])
        place = float(self.result.place_m[self.evaluation.lines.laser[self.line]])
        dose, inside = number(float(self.found.dose[self.e])), number(ratio / strength)
        yield self.step(
            "H",
            f"exposure at {number(place)} m (rule {RULES[rule]}): {dose} J x {inside} "
            "(fraction inside the aperture) / aperture area",
            ratio * limit,
            "J/m2",
        )
        yield self.step("H / H_MPE", f"{number(ratio * limit)} / {number(limit)}", ratio, "1")

    def _time_factors(self) -> Iterator[Step]:
        """The factors that depend on the duration: subtense and field angle."""
        alpha = self.evaluation.conditions.subtense_mrad[self.line : self.line + 1]
        time = self.found.time_s[self.e : self.e + 1]
        names = {token.partition("^")[0] for token in self.row.factors.split()}
        rule = self.published.subtense
        if rule.symbol in names:
            widest = float(self.rules.factor("alpha_max")(time)[0])
            small, wide = alpha[0] <= SMALL_SOURCE_MRAD, alpha[0] > widest
            form = rule.below if small else rule.beyond if wide else rule.between
            yield self.step(
                rule.symbol,
                f"{rule.symbol} = {form}, alpha = {number(alpha[0])} mrad, "
                f"alpha_min = {SMALL_SOURCE_MRAD:g} mrad, alpha_max = {number(widest)} mrad",
                float(self.rules.subtense_factor(alpha, time)[0]),
                "1",
                self.source(rule.source, rule.locator, rule.note),
                rule.known,
            )
        rule = self.published.field
        if rule.symbol in names:
            value = float(self.rules.field_factor(alpha, time)[0])
            angle = float(self.rules.factor("field_angle")(time)[0])
            form = rule.beyond if value > 1.0 else rule.below
            yield self.step(
                rule.symbol,
                f"{rule.symbol} = {form}, alpha = {number(alpha[0])} mrad, field angle {number(angle)} mrad",
                value,
                "1",
                self.source(rule.source, rule.locator, rule.note),
                rule.known,
            )

    def _average_steps(self, limit: float) -> Iterator[Step]:
        rate = float(self.evaluation.lines.rate_hz[self.line])
        exposure = float(self.evaluation.lines.exposure_s[self.line])
        text = f"pulses in T: max(1, {number(rate)} Hz x {number(exposure)} s), not rounded"
        yield self.step("N", text, float(self.found.count[self.e]), "1")
        yield self.step("H_MPE / N", "share of one pulse in the limit for T", limit, "J/m2")

    def _train_steps(self, limit: float) -> Iterator[Step]:
        rate, grouped = float(self.evaluation.lines.rate_hz[self.line]), float(self.found.grouped_s[self.e])
        unit, shared = "pulses", ""
        if grouped:
            unit, shared = "groups", f" / {number(rate * grouped)} pulses in a group"
            yield self.step(
                "n",
                f"pulses closer than {number(grouped)} s count as one pulse of that length: "
                f"{number(rate)} Hz x {number(grouped)} s",
                rate * grouped,
                "1",
            )
        within = "the shorter of T and T2" if self.rules.repetition.within_long_break else "T"
        count = float(self.found.count[self.e])
        yield self.step("N", f"{unit} within {within}, at least 1, not rounded", count, "1")
        row = self.rules.repetition.rows[int(self.found.c_p_row[self.e])]
        floor = f", at least {row.floor:g}" if row.floor else ""
        symbol = self.published.repetition_symbol
        yield self.step(
            symbol,
            f"row {row.row}: {limit_expression(row.coefficient, row.count_power, '', 'N')}{floor}, at most 1",
            float(self.found.c_p[self.e]),
            "1",
            self.source(row.source, row.locator, row.note),
            row.known,
        )
        yield self.step(f"H_MPE x {symbol}", f"limit of one pulse: H_MPE x {symbol}{shared}", limit, "J/m2")

    def _aperture(self) -> Step:
        time = self.found.aperture_s[self.e : self.e + 1]
        wavelength = self.evaluation.lines.wavelength_nm[self.line : self.line + 1]
        number_of = self.rules.apertures.rows(self.criteria.row[self.k : self.k + 1], wavelength, time)
        row = self.published.apertures[int(number_of[0])]
        at = number(float(time[0]))
        return self.step(
            "a",
            f"limiting aperture at {at} s: {limit_expression(row.coefficient_mm, row.time_power, '', at)} mm",
            float(self.criteria.aperture_m[self.k]) * 1e3,
            "mm",
            self.source(row.source, row.locator, row.note),
            row.known,
        )


def _verdict(evaluation: Evaluation, target: str, laser: int, members: list[int]) -> Iterator[Step]:
    """Which criterion governs, by how much it leads, and the optical density."""
    result = evaluation.target(target)
    governing = int(result.governing[laser])
    local = members.index(governing)
    rule = RULES[int(evaluation.exposures.rule[result.criteria.exposure[governing]])]
    row = evaluation.rules.rules.limits[result.criteria.row[governing]]
    text, lead = f"criterion {local + 1} ({rule}, {row.tissue}, {row.effect}) ", None
    if len(members) > 1:
        own = float(result.hazard_ratio[governing])
        runner = max(float(result.hazard_ratio[k]) for k in members if k != governing)
        text += f"governs; ratio to the next: {number(own)} / {number(runner)}"
        lead = own / runner
    else:
        text += "is the only one"
    yield Step("lead", text, lead, "1", target=target, criterion=local)
    worst = float(result.worst_ratio[laser])
    if result.sums is not None and (result.sums.laser == laser).any():
        text = "worst sum over lines that add, each with its worst criterion (stricter than like with like)"
        yield Step("sum of H / H_MPE", text, worst, "1", target=target)
    density = float(optical_density(np.array([worst]))[0])
    yield Step("OD", f"log10({number(worst)}), not below 0", density, "1", target=target)


def _moving_distance(evaluation: Evaluation, target: str, far: float, near: float) -> Iterator[Step]:
    """How spot or sweep look from the hazard distance, and the distance."""
    assert evaluation.moving is not None
    setup, there = evaluation.moving.setup, evaluation.moving.at(far).lines
    for k in range(there.count):
        if setup.spots is not None:
            text = f"the spot of line {k + 1} seen from {number(far)} m"
            yield Step("alpha(z)", text, float(there.subtense_mrad[k]), "mrad", line=k, target=target)
        elif setup.lines.mode[k] == CW:
            text = (
                f"one pass of line {k + 1} at {number(far)} m, {number(float(there.rate_hz[k]))} each second"
            )
            yield Step("t_p(z)", text, float(there.pulse_s[k]), "s", line=k, target=target)
    if near > 0.0:
        yield Step("z_near", "nearest distance at which a limit is exceeded", near, "m", target=target)
    text = "largest distance at which a limit is exceeded, solved with the limits that hold there"
    yield Step("z", text, far, "m", target=target)


def _distance(
    evaluation: Evaluation, target: str, laser: int, members: list[int], first_line: int
) -> Iterator[Step]:
    """The beam at the hazard distance and how the distance follows."""
    result, beams = evaluation.target(target), evaluation.lines.beams
    far, near = float(result.far_m[laser]), float(result.near_m[laser])
    if far == 0.0:
        yield Step("z", "no limit is exceeded anywhere: the distance is 0", 0.0, "m", target=target)
        return
    if np.isinf(far):
        yield Step("z", "the beam never spreads below its limit", None, "m", target=target)
        return
    if evaluation.moving is not None:
        yield from _moving_distance(evaluation, target, far, near)
        return
    reaching = max(members, key=lambda k: float(result.distance_m[k]))
    line = int(result.criteria.line[reaching])
    x, y = (float(d[0]) * 1e3 for d in beams.take(np.array([line])).diameters_m(np.array([far])))
    kind = "full width" if beams.tophat[line] else "1/e"
    size = number(x) if x == y else f"{number(x)} x {number(y)}"
    text = f"beam diameter there ({kind}), sqrt(d_0^2 + (phi x (z - z_0))^2): {size} mm"
    yield Step("d(z)", text, x, "mm", line=line - first_line, target=target)
    if near > 0.0:
        text = "nearest distance at which a limit is exceeded, ahead of the waist"
        yield Step("z_near", text, near, "m", target=target)
    text = "largest distance at which a limit is exceeded, solved by bracketing"
    if x == y and result.sums is None and not beams.tophat[line]:
        d0, phi, z0 = (float(a[line]) for a in beams.axes()[0])
        whole = number(float(result.criteria.strength[reaching]))
        aperture = number(float(result.criteria.aperture_m[reaching]) * 1e3)
        text += (
            f"; by hand: z_0 + sqrt(a^2 / -ln(1 - 1 / S) - d_0^2) / phi with S = {whole} (the ratio if the "
            f"whole beam entered), a = {aperture} mm, d_0 = {number(d0 * 1e3)} mm and "
            f"phi = {number(phi * 1e3)} mrad (both 1/e), z_0 = {number(z0)} m"
        )
    yield Step("z", text, far, "m", target=target)
