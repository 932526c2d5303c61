"""The working of optical density and scale numbers, step by step."""

from __future__ import annotations

from collections.abc import Iterator

from service.assess.lines import Lines
from service.assess.protection import LineNeed
from service.assess.scales import spot_area_m2
from service.assess.steps import Step, number
from service.rules.eyewear import EyewearTables
from service.rules.tables import Row

__all__ = ["protection_steps"]

UNITS = {"E": "W/m2", "H": "J/m2"}


def protection_steps(need: LineNeed, lines: Lines, tables: EyewearTables) -> Iterator[Step]:
    """Density, spot, value that counts, size factor and scale number of each mode, aligning number."""
    use = tables.use

    def step(symbol: str, text: str, value: float, unit: str, row: Row | None = None) -> Step:
        source = "" if row is None else tables.source_text(row)
        return Step(symbol, text, value, unit, source, "computed" if row is None else row.known, need.line)

    where = f"at {number(need.distance_m)} m"
    yield step("OD", f"lg(H / MPE) = lg({number(need.ratio)}), not below 0", need.density, "1")
    area, widest = spot_area_m2(lines, need.line, need.distance_m)
    text = f"1/e diameter {where}, the larger one; of a top hat the full width"
    yield step("d63", text, widest, "m", use["beam_share"])
    yield step("A", f"area of the spot {where}, pi / 4 x d63,x x d63,y", area, "m2")
    asked = zip(need.scales, need.numbers, need.strengths, need.densities, strict=True)
    for scale, needed, strength, density in asked:
        quantity, row = scale.row.quantity, scale.row
        rule = scale.group or (use["count_window"] if scale.pulses > 1.0 else None)
        yield step(f"{quantity}_{scale.mode}", scale.text, scale.value, UNITS[quantity], rule)
        counts = number(scale.value)
        if scale.size_factor > 1.0:
            size = use["size_exponent_glass_first"]
            text = f"(d63 in mm, held at {use['size_to'].value:g})^{size.value:g}"
            yield step("F", text, scale.size_factor, "1", size)
            counts = f"{counts} x F"
        bound = f"{row.coefficient:g} x 10^(n{row.exponent_offset:+g})"
        text = f"smallest n from 0 on with {bound} >= {counts}"
        yield step(f"LB_{scale.mode}", text, scale.wide, "1", row)
        if strength > scale.wide:
            text = "raised: lines of the band added, an oblong beam looked at farther on (stricter)"
            yield step(f"LB_{scale.mode}", text, strength, "1")
        if needed > strength:
            text = f"raised to the density that the limits ask of this mode, {number(density)}"
            yield step(f"LB_{scale.mode}", text, needed, "1")
    if need.alignment is not None and need.alignment.number is not None:
        of = "power" if need.alignment.unit == "W" else "energy of a pulse, pulse number included,"
        text = (
            f"first RB that holds the {of} through 7 mm, {number(need.alignment.value)} {need.alignment.unit}"
        )
        yield step("RB", text, need.alignment.number, "1", tables.alignment[0])
