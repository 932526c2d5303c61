"""Exposure limits for arrays of exposures.

Conventions (all rule sets): bands hold for lower <= x < upper, the last includes its end; the
subtense counts as at least alpha_min; limits are for the exposure from the whole source at the
cornea. Everything is structure of arrays: 1-d arrays of equal length, one element per exposure.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.rules.factors import Factor, compile_factors
from service.rules.grid import SMALL_SOURCE_MRAD, Grid
from service.rules.limit_set import Growth, LimitSet, StepRule
from service.rules.repetition import RepetitionFactor
from service.rules.tables import FactorRow, Row, TableError

__all__ = ["Conditions", "LimitTable"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(slots=True)
class Conditions:
    """What a limit needs to know of each line: 1-d arrays, one element per line.

    `wavelength_nm`, `subtense_mrad` (at least alpha_min), `extended` (1 above alpha_min),
    `long_break_s` (T2), `breaks` (the break times used as bounds) and the wavelength factors by name.
    """

    wavelength_nm: Floats
    subtense_mrad: Floats
    extended: Ints
    long_break_s: Floats
    breaks: list[Floats]
    factors: dict[str, Floats]

    def take(self, index: Ints) -> Conditions:
        """The conditions of the lines at `index`."""
        return Conditions(
            wavelength_nm=self.wavelength_nm[index],
            subtense_mrad=self.subtense_mrad[index],
            extended=self.extended[index],
            long_break_s=self.long_break_s[index],
            breaks=[b[index] for b in self.breaks],
            factors={name: values[index] for name, values in self.factors.items()},
        )


class LimitTable:
    """Limit rows and their factors ready for arrays.

    Raises TableError where the tables do not fit together.
    """

    def __init__(self, tables: LimitSet) -> None:
        rules = self._tables = tables
        self.factors = compile_factors(rules)
        for role, name in rules.roles.items():
            if name not in self.factors:
                raise TableError(rules.path / "factors.csv", 1, f"no factor {name!r} for role {role}")
        self.grid = Grid(rules, self.factors)
        self.repetition = RepetitionFactor(rules, self.factors)
        rows = rules.limits
        self.coefficient = np.array([r.coefficient for r in rows])
        irradiance = np.array([r.quantity in "EP" for r in rows])
        self.time_power = np.array([r.time_power for r in rows]) + irradiance
        self.powers = [p for p in np.unique(self.time_power) if p != 0.0]
        self.cap_power = irradiance.astype(float)
        self.cap = np.array([np.inf if r.cap is None else r.cap for r in rows])
        self.capped = np.isfinite(self.cap)
        self.tokens = self._tokens()
        self.line_factors = sorted(
            {name for name, _, _ in self.tokens if name in self.factors}
            & {n for n, f in self.factors.items() if f.variable == "wavelength_nm"}
        )
        self._check_factor_bands()

    def _tokens(self) -> list[tuple[str, float, NDArray[np.bool_]]]:
        """Every factor used, with its exponent and the rows that use it."""
        special = [self._tables.subtense.symbol, self._tables.field.symbol]
        if self._tables.growth is not None:
            special.append(self._tables.growth.symbol)
        uses: dict[tuple[str, float], NDArray[np.bool_]] = {}
        for k, row in enumerate(self._tables.limits):
            for token in row.factors.split():
                name, _, exponent = token.partition("^")
                if name not in self.factors and name not in special:
                    raise TableError(self._tables.path / "limits.csv", row.line, f"unknown factor {name!r}")
                try:
                    key = (name, float(exponent or 1))
                except ValueError:
                    message = f"the exponent of {token!r} is no number"
                    raise TableError(self._tables.path / "limits.csv", row.line, message) from None
                uses.setdefault(key, np.zeros(len(self._tables.limits), dtype=bool))[k] = True
        return [(name, exponent, rows) for (name, exponent), rows in uses.items()]

    def _check_factor_bands(self) -> None:
        """Every factor must be tabled over the whole band of each row that uses it."""
        tables = self._tables
        behind = {
            tables.subtense.symbol: tables.roles["alpha_max"],
            tables.field.symbol: tables.roles["field_angle"],
        }
        for name, _, rows in self.tokens:
            if tables.growth is not None and name == tables.growth.symbol:
                continue
            factor = self.factors[behind.get(name, name)]
            low, high = factor.rows[0].from_, factor.rows[-1].to or np.inf
            for k in rows.nonzero()[0]:
                row = tables.limits[k]
                if factor.variable == "wavelength_nm":
                    band = row.wavelength_from_nm, row.wavelength_to_nm
                elif factor.variable == "time_s":
                    band = self.grid.bounds[k]
                else:
                    band = row.subtense_from_mrad or 0.0, row.subtense_to_mrad or np.inf
                if band[0] < low * (1.0 - 1e-9) or band[1] > high * (1.0 + 1e-9):
                    message = f"{factor.name} is not tabled over the whole band of row {row.row!r}"
                    raise TableError(tables.path / "limits.csv", row.line, message)
        for row in tables.limits:
            if row.coefficient <= 0.0:
                message = f"coefficient is {row.coefficient:g}, expected a positive number"
                raise TableError(tables.path / "limits.csv", row.line, message)

    def factor(self, role: str) -> Factor:
        """The factor that plays a role of the engine (alpha_min, alpha_max, field_angle, ...)."""
        return self.factors[self._tables.roles[role]]

    def conditions(self, wavelength_nm: Floats, subtense_mrad: Floats) -> Conditions:
        """Conditions of each line from wavelength [nm] and subtense [mrad], 1-d arrays."""
        alpha = np.maximum(subtense_mrad, SMALL_SOURCE_MRAD)
        at = {"wavelength_nm": wavelength_nm, "subtense_mrad": alpha}
        return Conditions(
            wavelength_nm=wavelength_nm,
            subtense_mrad=alpha,
            extended=(alpha > SMALL_SOURCE_MRAD).astype(np.intp),
            long_break_s=self.factor("long_break")(alpha),
            breaks=[self.factors[b](at[self.factors[b].variable]) for b in self.grid.breaks],
            factors={name: self.factors[name](wavelength_nm) for name in self.line_factors},
        )

    def cells(self, at: Conditions, line: Ints, time_s: Floats) -> Ints:
        """Grid cell of each exposure: `line` indexes the conditions, `time_s` is its duration."""
        after = [time_s >= b[line] for b in at.breaks]
        return self.grid.cells(at.wavelength_nm[line], time_s, at.extended[line], after)

    def values(self, row: NDArray[np.int16], at: Conditions, line: Ints, time_s: Floats) -> Floats:
        """Limit of each exposure as a dose: coefficient x t^power x factors, E and P rows x t.

        J/m2 for rows of H and E, J for rows of Q and P.

        Parameters
        ----------
        row : (n,) row numbers; line : (n,) index into the conditions; time_s : (n,) duration [s].
        """
        limit: Floats = self.coefficient[row]
        power = self.time_power[row]
        for p in self.powers:
            k = (power == p).nonzero()[0]
            if k.size:
                limit[k] *= time_s[k] if p == 1.0 else time_s[k] ** p
        for name, exponent, rows in self.tokens:
            k = rows[row].nonzero()[0]
            if not k.size:
                continue
            value = self.value(name, at, line[k], time_s[k])
            limit[k] *= value if exponent == 1.0 else value**exponent
        k = self.capped[row].nonzero()[0]
        if k.size:
            cap = self.cap[row[k]] * time_s[k] ** self.cap_power[row[k]]
            limit[k] = np.minimum(limit[k], cap)
        return limit

    def value(self, name: str, at: Conditions, line: Ints, time_s: Floats) -> Floats:
        """One factor for each exposure."""
        if name in at.factors:
            return at.factors[name][line]
        if name == self._tables.subtense.symbol:
            return self.subtense_factor(at.subtense_mrad[line], time_s)
        if name == self._tables.field.symbol:
            return self.field_factor(at.subtense_mrad[line], time_s)
        if name == self._tables.roles["long_break"]:
            return at.long_break_s[line]
        if self._tables.growth is not None and name == self._tables.growth.symbol:
            return self.growth_factor(at.wavelength_nm[line], time_s)
        return self.factors[name](time_s)

    def factor_row(self, name: str, at: Conditions, line: int, time_s: float) -> Row | StepRule | Growth:
        """Where a factor's value for a line at a duration is printed."""
        tables = self._tables
        if name == tables.subtense.symbol:
            return tables.subtense
        if name == tables.field.symbol:
            return tables.field
        if tables.growth is not None and name == tables.growth.symbol:
            return tables.growth
        factor = self.factors[name]
        x = {
            "wavelength_nm": at.wavelength_nm[line],
            "subtense_mrad": at.subtense_mrad[line],
            "time_s": time_s,
        }
        return factor.rows[int(factor.piece(np.array([x[factor.variable]]))[0])]

    def factor_text(self, name: str, at: Conditions, line: int, time_s: float) -> str:
        """A factor's value for a line at a duration as an expression."""
        row = self.factor_row(name, at, line, time_s)
        alpha = float(at.subtense_mrad[line])
        if isinstance(row, Growth):
            return f"{name} = max(1, min(t, {row.until_s:g} s) x rate) with the rate of the wavelength"
        if isinstance(row, StepRule):
            widest = self.factor("alpha_max" if row is self._tables.subtense else "field_angle")
            edge = float(widest(np.array([time_s]))[0])
            form = row.beyond if alpha > edge else row.between or row.below
            form = row.below if alpha <= SMALL_SOURCE_MRAD else form
            return f"{name} = {form}, alpha = {alpha:.6g} mrad, {widest.name} = {edge:.6g} mrad"
        assert isinstance(row, FactorRow)
        x = {"wavelength_nm": at.wavelength_nm[line], "subtense_mrad": alpha, "time_s": time_s}
        return f"{name} = {row.expression(float(x[row.variable]))}"

    def subtense_factor(self, alpha_mrad: Floats, time_s: Floats) -> Floats:
        """C_E (C6): alpha / alpha_min, beyond alpha_max(t) alpha^2 / (alpha_min alpha_max)."""
        value: Floats = alpha_mrad / SMALL_SOURCE_MRAD
        k = (alpha_mrad > SMALL_SOURCE_MRAD).nonzero()[0]
        if k.size:
            alpha = alpha_mrad[k]
            value[k] *= np.maximum(1.0, alpha / self.factor("alpha_max")(time_s[k]))
        return value

    def growth_factor(self, wavelength_nm: Floats, time_s: Floats) -> Floats:
        """The factor of wavelength and time (k2): max(1, min(t, until) x rate)."""
        growth = self._tables.growth
        assert growth is not None
        rate = np.zeros(wavelength_nm.shape)
        for low, high, origin, per in growth.bands:
            inside = (wavelength_nm >= low) & (wavelength_nm <= high)
            rate[inside] = (1.0 if origin is None else wavelength_nm[inside] - origin) / per
        return np.maximum(1.0, np.minimum(time_s, growth.until_s) * rate)

    def field_factor(self, alpha_mrad: Floats, time_s: Floats) -> Floats:
        """(alpha / gamma(t))^2 for a source wider than the photochemical field angle, else 1."""
        return np.maximum(1.0, alpha_mrad / self.factor("field_angle")(time_s)) ** 2
