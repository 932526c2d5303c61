"""The same laser under every rule set, with what makes the figures differ."""

from __future__ import annotations

from dataclasses import dataclass

from service.contract.answer import rule_sets
from service.contract.evaluation import EvaluationResult
from service.contract.result import Criterion, TargetAnswer
from service.web import present
from service.web.numbers import shown_down, shown_up

__all__ = ["Side", "side_by_side"]

#: Two figures that agree this closely are the same.
SAME = 1e-9
#: Factors of the working that are named where two rule sets give them other values.
FACTORS = ("C_A", "C_B", "C_C", "C_E", "T1", "T2", "t_min", "gamma")


@dataclass(frozen=True, slots=True)
class Side:
    """One rule set: its answer, the durations it took, and how it differs from the chosen one."""

    result: EvaluationResult
    chosen: bool
    strictest: bool
    durations: list[str]
    differences: list[str]


def side_by_side(results: list[EvaluationResult]) -> list[Side]:
    """Every rule set beside the first, which is the chosen one."""
    base = results[0]
    ratios = [r.eye.hazard_ratio for r in results]
    worst, alike = max(ratios), _close(min(ratios), max(ratios))
    return [
        Side(
            result=r,
            chosen=r is base,
            strictest=not alike and r.eye.hazard_ratio >= worst * (1.0 - SAME),
            durations=list(dict.fromkeys(present.duration(d.exposure_s) for d in r.durations)),
            differences=[] if r is base else _differences(base, r),
        )
        for r in results
    ]


def _close(a: float | None, b: float | None) -> bool:
    if a is None or b is None:
        return a is b
    return abs(a - b) <= SAME * max(abs(a), abs(b))


def _distance(metres: float | None) -> str:
    if metres is None:
        return "no end"
    return "no hazard distance" if metres == 0.0 else f"{shown_up(metres)} m"


def _called(c: Criterion, lines: int) -> str:
    where = f", line {c.line + 1}" if lines > 1 else ""
    return f"{present.RULE_NAMES[c.rule]} ({c.tissue}, {c.effect}{where})"


def _differences(base: EvaluationResult, other: EvaluationResult) -> list[str]:
    """Sentences that tell how and why another rule set differs from the chosen one."""
    found = []
    for name, a, b in (("Eye", base.eye, other.eye), ("Skin", base.skin, other.skin)):
        if _close(a.hazard_ratio, b.hazard_ratio) and _close(a.hazard_distance_m, b.hazard_distance_m):
            found.append(f"{name}: the same figures.")
            continue
        reasons = _reasons(base, other, a, b, name.lower())
        found.append(
            f"{name}: {_distance(b.hazard_distance_m)} instead of {_distance(a.hazard_distance_m)}, "
            f"{shown_up(b.hazard_ratio)} times the limit instead of {shown_up(a.hazard_ratio)}"
            + (f", because {'; '.join(reasons)}." if reasons else ".")
        )
    return found


def _reasons(
    base: EvaluationResult, other: EvaluationResult, a: TargetAnswer, b: TargetAnswer, target: str
) -> list[str]:
    """What differs in the criterion that governs under the other rule set."""
    lines = len(base.durations)
    now = present.governing(b)
    index = next((k for k, c in enumerate(a.criteria) if _key(c) == _key(now)), None)
    reasons = []
    times = base.durations[now.line].exposure_s, other.durations[now.line].exposure_s
    if times[0] != times[1]:
        reasons.append(
            f"its usual exposure lasts {present.duration(times[1])} instead of {present.duration(times[0])}"
        )
    if _key(present.governing(a)) != _key(now):
        reasons.append(f"{_called(now, lines)} governs instead of {_called(present.governing(a), lines)}")
    if index is None:
        reasons.append(f"{base.rules.title} has no such criterion here")
        return reasons
    before = a.criteria[index]
    texts = _limit(base, before), _limit(other, now)
    if texts[0] != texts[1]:
        reasons.append(f"its limit is {texts[1]}, not {texts[0]}")
    reasons += _factors(base, other, target, index, b.criteria.index(now), now.line)
    if before.aperture_mm != now.aperture_mm:
        reasons.append(
            f"it averages over {shown_down(now.aperture_mm)} mm instead of "
            f"{shown_down(before.aperture_mm)} mm"
        )
    factors = before.pulse_factor, now.pulse_factor
    if factors[0] is not None and factors[1] is not None and not _close(*factors):
        reasons.append(
            f"C_P is {shown_down(factors[1])} for {shown_up(now.pulses or 1.0)} pulses instead of "
            f"{shown_down(factors[0])} for {shown_up(before.pulses or 1.0)}"
        )
    return reasons


def _key(c: Criterion) -> tuple[int, str, str, str]:
    return c.line, c.rule, c.tissue, c.effect


def _limit(result: EvaluationResult, c: Criterion) -> str:
    """The limit of a criterion as its rule set prints it."""
    rows = rule_sets()[result.rules.id].rules.limits
    return next(present.limit_text(row) for row in rows if row.row == c.row)


def _factors(
    base: EvaluationResult, other: EvaluationResult, target: str, index: int, number: int, line: int
) -> list[str]:
    """Named factors of a criterion that have another value under the other rule set."""
    before, now = _values(base, target, index, line), _values(other, target, number, line)
    return [
        f"{symbol} is {shown_up(now[symbol], 4)} instead of {shown_up(before[symbol], 4)}"
        for symbol in FACTORS
        if symbol in before and symbol in now and not _close(before[symbol], now[symbol])
    ]


def _values(result: EvaluationResult, target: str, criterion: int, line: int) -> dict[str, float]:
    """Values of the working that belong to a criterion, or to its line."""
    return {
        step.symbol: step.value
        for step in result.working
        if step.value is not None
        and step.line == line
        and (step.criterion is None or (step.target == target and step.criterion == criterion))
    }
