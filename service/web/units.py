"""Units that people choose on the form, and the unit that the computation takes.

Every family has one unit of the computation (the one in the field's name); the others are exact decimal
multiples of it, angles in degrees aside.
"""

from __future__ import annotations

import math
from decimal import Context, Decimal
from typing import NamedTuple

from service.web.numbers import plain, typeset

__all__ = ["FAMILIES", "Unit", "base_unit", "convert", "echo"]


class Unit(NamedTuple):
    """A unit: its name in an address, as shown, and how many units of the computation it is."""

    key: str
    shown: str
    factor: Decimal


def _family(*units: str) -> tuple[Unit, ...]:
    """Units from 'key shown factor'; the first is the unit of the computation."""
    return tuple(Unit(key, shown, Decimal(factor)) for key, shown, factor in (u.split() for u in units))


#: One degree in milliradians.
DEGREE = repr(math.pi / 180.0 * 1e3)
FAMILIES: dict[str, tuple[Unit, ...]] = {
    "wavelength": _family("nm nm 1", "um µm 1e3"),
    "power": _family("W W 1", "mW mW 1e-3", "uW µW 1e-6", "kW kW 1e3"),
    "energy": _family("J J 1", "mJ mJ 1e-3", "uJ µJ 1e-6", "nJ nJ 1e-9"),
    "time": _family("s s 1", "ms ms 1e-3", "us µs 1e-6", "ns ns 1e-9", "ps ps 1e-12", "fs fs 1e-15"),
    "rate": _family("Hz Hz 1", "kHz kHz 1e3", "MHz MHz 1e6", "GHz GHz 1e9"),
    "width": _family("mm mm 1", "um µm 1e-3", "cm cm 10", "m m 1e3"),
    "core": _family("um µm 1", "mm mm 1e3"),
    "angle": _family("mrad mrad 1", "urad µrad 1e-3", f"deg ° {DEGREE}"),
    "distance": _family("m m 1", "mm mm 1e-3", "cm cm 1e-2", "km km 1e3", "ft ft 0.3048"),
    "visibility": _family("km km 1",),
    "turn": _family("deg ° 1"),
    "share": (Unit("1", "of 1", Decimal(1)), Unit("pc", "%", Decimal("0.01"))),
    "percent": _family("pc % 1"),
    "bare": (Unit("1", "", Decimal(1)),),
}  # fmt: skip
#: Digits of an echo that is not exact (degrees).
SHOWN = Context(prec=6)


def base_unit(family: str) -> Unit:
    """The unit of the computation."""
    return FAMILIES[family][0]


def _unit(family: str, key: str) -> Unit:
    return next((u for u in FAMILIES[family] if u.key == key), base_unit(family))


def convert(value: float, family: str, key: str) -> float:
    """A typed value in the unit of the computation; decimal, so that 5 mW is 0.005 W exactly."""
    return float(Decimal(repr(value)) * _unit(family, key).factor)


def echo(value: float, typed: str, family: str, key: str) -> str:
    """What was understood, where it reads otherwise than what was typed.

    In another unit: the value in the unit of the computation. In that unit, but far from one: the value
    in the unit people would say, so that a slip of the exponent shows.
    """
    unit, base = _unit(family, key), base_unit(family)
    if unit != base:
        exact = Decimal(repr(value)) * unit.factor
        if unit.key == "deg":
            return f"≈ {typeset(float(SHOWN.create_decimal(exact)))} {base.shown}"
        return f"= {typeset(float(exact))} {base.shown}"
    fitting = [
        u
        for u in FAMILIES[family]
        if u.key not in ("deg", "pc", "ft") and 1 <= Decimal(repr(value)) / u.factor < 1000
    ]
    if value and not 0.1 <= value < 10000 and fitting and base not in fitting:
        other = max(fitting, key=lambda u: u.factor)
        return f"= {typeset(float(Decimal(repr(value)) / other.factor))} {other.shown}"
    return "" if typed == plain(value) else f"= {typeset(value)} {base.shown}".rstrip()
