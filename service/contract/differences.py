"""Where the rule sets disagree: known differences with live figures, and limits of two sets side by side."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, ValidationError

from service.contract.answer import rule_set, rule_sets
from service.contract.check_values import READERS
from service.files import DATA
from service.rules.tables import TableError, read_toml

__all__ = ["Difference", "Differences", "Versus", "differences", "strictest_j_m2", "versus"]

Floats = NDArray[np.float64]
#: Points of a curve, before those on both sides of every step are added.
POINTS = 300
#: Relative distance from a step at which both of its sides are asked.
BESIDE = 1e-9
LONGEST_S = 3e4


class Difference(BaseModel):
    """One known difference."""

    model_config = ConfigDict(extra="forbid")

    id: str
    title: str
    text: str = Field(description="What the documents say, and which result it moves.")
    known: Literal["read", "memory"] = Field(description="How the older and the newer reading are known.")
    ask: dict[str, Any] = Field(description="Where the figures are taken; units stand in the names.")
    unit: str
    chart: dict[str, str | float] = Field(description="A view of the chart that shows it.")
    figures: dict[str, float] = Field(default={}, description="What each rule set answers there, by id.")


class Differences(BaseModel):
    """All known differences."""

    differences: list[Difference]


@cache
def differences(path: Path = DATA / "differences.toml") -> Differences:
    """The known differences with a figure of each rule set. Raises TableError where the file is faulty."""
    found = []
    try:
        for entry in read_toml(path)["difference"]:
            one = Difference.model_validate(entry)
            read = READERS[one.ask["read"]]
            figures = {key: read({**one.ask, "rules": key}) for key in rule_sets()}
            found.append(one.model_copy(update={"figures": figures}))
    except (KeyError, ValidationError) as error:
        raise TableError(path, 1, str(error)) from None
    return Differences(differences=found)


def strictest_j_m2(
    rules_id: str, target: str, wavelength_nm: Floats, time_s: Floats, subtense_mrad: float
) -> Floats:
    """Strictest limit of one exposure [J/m2] under a rule set, for arrays of wavelength [nm] and time [s].

    Limits of different tissues are compared as they stand, each for its own aperture. Raises InvalidRequest
    where there is no such rule set.
    """
    rules = rule_set(rules_id)
    line = np.arange(len(wavelength_nm))
    at = rules.conditions(wavelength_nm, np.full(len(wavelength_nm), subtense_mrad))
    rows = rules.grid.rows(target, rules.cells(at, line, time_s))
    which, slot = np.nonzero(rows >= 0)
    strictest = np.full(len(wavelength_nm), np.inf)
    np.minimum.at(strictest, which, rules.values(rows[which, slot], at, which, time_s[which]))
    return strictest


@dataclass(frozen=True, slots=True)
class Versus:
    """Limits of two rule sets [J/m2] along one axis: x in nm or s."""

    x: Floats
    first: Floats
    second: Floats

    @property
    def apart(self) -> float:
        """Share of the points at which the two differ by more than a thousandth."""
        return float(np.mean(np.abs(np.log(self.second / self.first)) > 1e-3))

    def widest(self) -> int:
        """Number of the point at which the two differ most."""
        return int(np.argmax(np.abs(np.log(self.second / self.first))))


def versus(
    sets: tuple[str, str],
    target: str,
    along: Literal["wavelength", "time"],
    ends: tuple[float, float],
    fixed: float,
    subtense_mrad: float = 1.5,
) -> Versus:
    """Two rule sets along wavelength [nm] or time [s] between `ends`; the other is `fixed`.

    Points are evenly spaced by logarithm, with both sides of every step of either rule set.
    """
    steps = set()
    for key in sets:
        grid = rule_set(key).grid
        steps |= set((grid.wavelengths if along == "wavelength" else grid.times).tolist())
    inside = np.array(sorted(s for s in steps if math.isfinite(s) and s > 0.0))
    points = [np.geomspace(*ends, POINTS), inside * (1 - BESIDE), inside * (1 + BESIDE)]
    x = np.unique(np.concatenate(points))
    x = x[(x >= ends[0]) & (x <= ends[1])]
    other = np.full(len(x), fixed)
    wavelength, time = (x, other) if along == "wavelength" else (other, x)
    found = [strictest_j_m2(key, target, wavelength, time, subtense_mrad) for key in sets]
    return Versus(x, *found)
