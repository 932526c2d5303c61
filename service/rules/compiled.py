"""Compiled rule sets: limits, limiting apertures, additivity and conventional durations."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from service.rules.additivity import additivity_classes
from service.rules.apertures import Apertures
from service.rules.limits import LimitTable
from service.rules.ruleset import RuleSet, load_all
from service.rules.tables import TableError

__all__ = ["CompiledRules", "compiled_rules"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


class CompiledRules(LimitTable):
    """One rule set ready for arrays. Raises TableError where its tables do not fit together."""

    def __init__(self, rules: RuleSet) -> None:
        super().__init__(rules)
        self.rules = rules
        self.apertures = Apertures(rules)
        self.additivity = additivity_classes(rules)
        self._defaults = _default_rows(rules)
        self._default_edges = np.array([rules.durations[k].wavelength_from_nm for k in self._defaults])
        self._default_seconds = np.array([rules.durations[k].duration_s for k in self._defaults])

    def default_duration(self, wavelength_nm: Floats) -> tuple[Floats, Ints]:
        """Conventional duration [s] for an unintended exposure, and its row's number."""
        at = np.searchsorted(self._default_edges, wavelength_nm, "right") - 1
        return self._default_seconds[at], np.array(self._defaults)[at]


def _default_rows(rules: RuleSet) -> list[int]:
    """Numbers of the default durations in order of wavelength. Raises TableError on a gap."""
    numbers = [k for k, row in enumerate(rules.durations) if row.kind == "default"]
    rows = [rules.durations[k] for k in numbers]
    low = min(row.wavelength_from_nm for row in rules.limits)
    high = max(row.wavelength_to_nm for row in rules.limits)
    edges = [low] + [row.wavelength_to_nm for row in rows]
    if [row.wavelength_from_nm for row in rows] + [high] != edges:
        raise TableError(rules.path / "durations.csv", 1, "the default durations leave a gap or overlap")
    return numbers


@lru_cache(maxsize=4)
def compiled_rules(data: Path) -> dict[str, CompiledRules]:
    """Every rule set under a data folder, compiled once. Raises TableError."""
    return {key: CompiledRules(rules) for key, rules in load_all(data).items()}
