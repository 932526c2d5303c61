"""Figures as a sign prints them: three digits, rounded to the safe side, with a prefix to the unit.

Powers, energies, rates, densities and distances are rounded up; pulse durations down, because the same
energy in a shorter time is the harder pulse. Wavelengths are printed as given. A no-break
space keeps number and unit together.
"""

from __future__ import annotations

from decimal import ROUND_CEILING, ROUND_FLOOR, Context, Decimal

__all__ = ["density", "exact", "measure", "number", "wavelength"]

PREFIXES = {12: "T", 9: "G", 6: "M", 3: "k", 0: "", -3: "m", -6: "µ", -9: "n", -12: "p", -15: "f", -18: "a"}
DIGITS = 3


def exact(value: float) -> Decimal:
    """The number as the answer prints it."""
    return Decimal(repr(float(value)))


def number(value: Decimal, decimal: str) -> str:
    """A number in full, without needless zeros; three decimals after few digits get a zero more.

    1,064 can be read as a thousand: it is printed 1,0640.
    """
    text = f"{value:f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
        whole, _, part = text.partition(".")
        if len(part) == 3 and whole != "0" and len(whole) <= 3:
            text += "0"
    return text.replace(".", decimal)


def measure(value: Decimal, unit: str, decimal: str, *, up: bool = True, prefixes: str = "TGMkmµnpfa") -> str:
    """A value with its unit, 1 to 999 before the prefix where one of `prefixes` allows it."""
    rounded = Context(prec=DIGITS, rounding=ROUND_CEILING if up else ROUND_FLOOR).create_decimal(value)
    exponent = 0
    if rounded:
        wanted = rounded.adjusted() // 3 * 3
        allowed = [e for e, p in PREFIXES.items() if p in prefixes or not p]
        exponent = max((e for e in allowed if e <= wanted), default=min(allowed))
    return f"{number(rounded.scaleb(-exponent), decimal)}\u00a0{PREFIXES[exponent]}{unit}"


def density(value: Decimal, decimal: str) -> str:
    """An optical density, rounded up to one decimal."""
    return number(value.quantize(Decimal("0.1"), rounding=ROUND_CEILING), decimal)


def wavelength(value: float, decimal: str) -> str:
    """A wavelength [nm] exactly as given, in µm from 10 µm on."""
    given = exact(value)
    if given >= 10_000:
        return f"{number(given.scaleb(-3).normalize(), decimal)}\u00a0µm"
    return f"{number(given, decimal)}\u00a0nm"
