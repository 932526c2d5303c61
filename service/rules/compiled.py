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

    def default_duration(self, wavelength_nm: Floats) -> tuple[Floats, Ints]:
        """Conventional duration [s] for an unintended exposure, and its row's number."""
        index = [k for k, r in enumerate(self.rules.durations) if r.kind == "default"]
        edges = np.array([self.rules.durations[k].wavelength_from_nm for k in index])
        at = np.searchsorted(edges, wavelength_nm, "right") - 1
        seconds = np.array([self.rules.durations[k].duration_s for k in index])
        return seconds[at], np.array(index)[at]


@lru_cache(maxsize=4)
def compiled_rules(data: Path) -> dict[str, CompiledRules]:
    """Every rule set under a data folder, compiled once. Raises TableError."""
    return {key: CompiledRules(rules) for key, rules in load_all(data).items()}
