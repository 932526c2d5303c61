"""Steps of the working, and table rows as expressions."""

from __future__ import annotations

from dataclasses import dataclass

from service.rules.tables import FactorRow

__all__ = ["Step", "factor_expression", "limit_expression", "number"]


@dataclass(frozen=True, slots=True)
class Step:
    """One step: symbol, expression in words and numbers, value, unit and source.

    `known` is read, memory, computed or entered. `line` and `criterion` count from 0, the criterion
    within its target; None where the step belongs to all.
    """

    symbol: str
    text: str
    value: float | None
    unit: str
    source: str = ""
    known: str = "computed"
    line: int | None = None
    target: str | None = None
    criterion: int | None = None


def number(x: float) -> str:
    """A number for the text of a step: six significant digits."""
    return f"{x:.6g}"


def factor_expression(row: FactorRow, x: float | str) -> str:
    """One piece of a factor as an expression of x (a number or a symbol)."""
    at = x if isinstance(x, str) else number(x)
    if row.slope:
        slope = "" if row.slope == 1 else f"{row.slope:g} x "
        per = f" / {row.per:g}" if row.per else ""
        power = f"10^({slope}({at} - {row.origin or 0:g}){per})"
        text = power if row.coefficient == 1 else f"{row.coefficient:g} x {power}"
    else:
        text = f"{row.coefficient:g}"
    if row.offset:
        text = f"{row.offset:g} + {text}"
    return f"{text} x {at}^{row.power:g}" if row.power else text


def limit_expression(coefficient: float, power: float, factors: str, x: str) -> str:
    """A limit, aperture or pulse factor as an expression: coefficient x base^power x factors."""
    parts = [] if coefficient == 1 and (power or factors) else [f"{coefficient:g}"]
    if power:
        parts.append(f"{x}^{power:g}")
    return " x ".join(parts + factors.split())
