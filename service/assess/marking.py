"""Markings of eyewear and screens in the standards' own notation: ``315-532 D LB5 + IR LB6``."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

__all__ = ["Mark", "MarkingError", "parse_marking"]

RANGE = re.compile(r"(>?)\s*(\d+(?:[.,]\d+)?)\s*(?:[-–]\s*(\d+(?:[.,]\d+)?))?(?=\s|$)", re.ASCII)
MARK = re.compile(r"([A-Z]+)\s+(LB|AB)\s*(\d+)\s*(Y)?", re.ASCII)
ALIGNMENT = re.compile(r"RB\s*(\d+)", re.ASCII)
MODES = "DIRM"


class MarkingError(ValueError):
    """A marking that cannot be read; the message says why."""


@dataclass(frozen=True, slots=True)
class Mark:
    """One mark: scale LB, AB or RB, its number, the modes it was tested for and its band [nm].

    `low_rate_untested` is the mark Y; the band is None where the marking names none. A range written
    with ">" begins just above its first wavelength.
    """

    scale: str
    number: int
    modes: str
    low_rate_untested: bool
    from_nm: float | None
    to_nm: float | None


def parse_marking(text: str) -> list[Mark]:
    """The marks of a marking, in order. Raises MarkingError with the reason.

    Parts are joined by "+"; a part without a wavelength range of its own takes that of the part before.
    """
    if not text.strip():
        raise MarkingError("the marking is empty")
    band: tuple[float, float] | None = None
    marks: list[Mark] = []
    for part in (p.strip() for p in text.split("+")):
        if not part:
            raise MarkingError("there is nothing between two plus signs or at an end")
        found = RANGE.match(part)
        rest = part
        if found:
            band = _band(found)
            rest = part[found.end() :].strip()
        marks.append(_mark(rest, band))
        for mode in marks[-1].modes:
            if any(
                mode in m.modes and (m.from_nm, m.to_nm) == (marks[-1].from_nm, marks[-1].to_nm)
                for m in marks[:-1]
            ):
                raise MarkingError(f"mode {mode} stands twice for the same wavelengths")
    return marks


def _band(found: re.Match[str]) -> tuple[float, float]:
    low = float(found[2].replace(",", "."))
    high = float((found[3] or found[2]).replace(",", "."))
    if not 180.0 <= low <= high <= 1e6:
        raise MarkingError(
            f"the range {found[0].strip()} is no range of nanometres from 180 to 1 000 000, low to high"
        )
    if found[1] and not found[3]:
        raise MarkingError(f"the range {found[0].strip()} begins above a wavelength and has no end")
    return (math.nextafter(low, math.inf) if found[1] else low), high


def _mark(text: str, band: tuple[float, float] | None) -> Mark:
    low, high = band or (None, None)
    alignment = ALIGNMENT.fullmatch(text)
    if alignment:
        number = int(alignment[1])
        if not 1 <= number <= 5:
            raise MarkingError(f"{text}: scale numbers of alignment eyewear are RB1 to RB5")
        return Mark("RB", number, "", False, low, high)
    found = MARK.fullmatch(text)
    if not found:
        if re.search(r"\bL\s*\d", text):
            raise MarkingError(
                f"{text!r}: L numbers belong to the older edition; scale numbers are LB1 to LB10"
            )
        if not re.search(r"(LB|AB|RB)\s*\d", text):
            raise MarkingError(f"{text!r} has no scale number; write the modes, then LB1 to LB10")
        raise MarkingError(
            f"{text!r} is not modes (D, I, R, M), a blank and LB1 to LB10; leave out maker's marks"
        )
    modes, scale, number = found[1], found[2], int(found[3])
    unknown = [m for m in modes if m not in MODES]
    if unknown:
        raise MarkingError(f"{unknown[0]} is no mode; there are D, I, R and M")
    if len(set(modes)) != len(modes):
        raise MarkingError(f"a mode stands twice in {modes}")
    if not 1 <= number <= 10:
        raise MarkingError(f"{scale}{number}: scale numbers are {scale}1 to {scale}10")
    return Mark(scale, number, modes, found[4] is not None, low, high)
