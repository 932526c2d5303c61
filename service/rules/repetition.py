"""Repetitive pulses: grouping time and the factor C_P (C5) for arrays."""

from __future__ import annotations

from itertools import product

import numpy as np
from numpy.typing import NDArray

from service.rules.factors import Factor
from service.rules.limit_set import LimitSet
from service.rules.tables import TableError

__all__ = ["RepetitionFactor"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


class RepetitionFactor:
    """C_P by pulse length, exposure, subtense and pulse count, as the rows of repetition.csv say.

    Bands are from < x <= to; the first row in file order that holds is taken. Raises TableError
    where a row names an unknown bound or a train could find no row.
    """

    def __init__(self, rules: LimitSet, factors: dict[str, Factor]) -> None:
        self.rows = rules.repetition
        self.alpha_max = factors[rules.roles["alpha_max"]]
        self.grouping = factors[rules.roles["grouping"]]
        self.within_long_break = rules.count_within == "T2"
        path = rules.path / "repetition.csv"
        for row in self.rows:
            for bound in (row.subtense_from_mrad, row.subtense_to_mrad):
                if isinstance(bound, str) and bound != rules.roles["alpha_max"]:
                    raise TableError(path, row.line, f"unknown bound {bound!r}")
        if (self.row(*self._every_band()) < 0).any():
            raise TableError(path, 1, "the repetition rows leave a gap: some trains find no row")

    def _every_band(self) -> tuple[Floats, ...]:
        """Trains on and beside every bound: pulse, grouping, exposure [s], subtense [mrad], count."""
        rows = self.rows

        def beside(bounds: list[float | str | None], least: float) -> list[float]:
            numbers = sorted({b for b in bounds if isinstance(b, float)})
            return [least, *numbers, *(b * 1.001 for b in numbers)]

        exposures = beside([b for r in rows for b in (r.exposure_from_s, r.exposure_to_s)], 1e-9)
        subtenses = beside([b for r in rows for b in (r.subtense_from_mrad, r.subtense_to_mrad)], 1.5)
        counts = beside([b for r in rows for b in (r.count_from, r.count_to)], 1.0)
        pulses = [1e-12, 1e-4, 1e-3, 1.0]
        trains = np.array(list(product(pulses, [1e-5], exposures, [*subtenses, 50.0], counts)))
        return tuple(trains.T)

    def grouping_s(self, wavelength_nm: Floats) -> Floats:
        """Time within which pulses count as one [s]; 0 where the table gives none."""
        value = self.grouping(wavelength_nm)
        return np.where(wavelength_nm < self.grouping.edges[0], 0.0, value)

    def row(
        self, pulse_s: Floats, grouping_s: Floats, exposure_s: Floats, alpha_mrad: Floats, count: Floats
    ) -> Ints:
        """Number of the row that holds for each train, -1 where none does. 1-d arrays."""
        chosen = np.full(pulse_s.shape, -1, dtype=np.intp)
        widest = self.alpha_max(pulse_s)
        short = pulse_s <= grouping_s
        for number, row in enumerate(self.rows):
            holds = chosen < 0
            if row.pulse != "any":
                holds &= short == (row.pulse == "short")
            for low, high, x in (
                (row.exposure_from_s, row.exposure_to_s, exposure_s),
                (row.subtense_from_mrad, row.subtense_to_mrad, alpha_mrad),
                (row.count_from, row.count_to, count),
            ):
                if low is not None:
                    holds &= x > (widest if isinstance(low, str) else low)
                if high is not None:
                    holds &= x <= (widest if isinstance(high, str) else high)
            chosen[holds] = number
        return chosen

    def __call__(self, number: Ints, count: Floats) -> Floats:
        """C_P from the row numbers and the pulse counts N: coefficient x N^power, within bounds."""
        value = np.ones(count.shape)
        for k, row in enumerate(self.rows):
            at = (number == k).nonzero()[0]
            if at.size and (row.count_power or row.coefficient != 1.0):
                factor = row.coefficient * count[at] ** row.count_power
                value[at] = np.minimum(1.0, np.maximum(factor, row.floor or 0.0))
        return value
