"""How long somebody looks, in words: the usual durations of the rule sets as choices of the form."""

from __future__ import annotations

from functools import cache

from service.contract.answer import rule_sets
from service.contract.evaluation import EvaluationResult
from service.web.numbers import plain

__all__ = ["OTHER", "USUAL", "looks", "words_for"]

#: Choices beside the durations of the tables: nothing chosen, and a number that is typed.
USUAL, OTHER = "usual", "other"


@cache
def looks() -> dict[str, str]:
    """Words of every duration offered, by its seconds as typed in the form."""
    rows = [d for c in rule_sets().values() for d in c.rules.durations if d.kind == "choice"]
    found: dict[str, str] = {}
    for row in sorted(rows, key=lambda d: d.duration_s):
        found.setdefault(plain(row.duration_s), row.words)
    return found


def words_for(result: EvaluationResult) -> str:
    """What the one exposure duration of every line is called; blank where no words fit all wavelengths."""
    seconds = {d.exposure_s for d in result.durations}
    if len(seconds) != 1:
        return ""
    rules = rule_sets()[result.rules.id].rules
    wavelengths = [line["wavelength_nm"] for line in result.inputs["lines"]]
    (duration,) = seconds
    for row in rules.durations:
        low, high = row.wavelength_from_nm, row.wavelength_to_nm
        if row.kind == "choice" and row.duration_s == duration and all(low <= w <= high for w in wavelengths):
            return row.words
    return ""
