"""The report's figures beside eye and skin: lit spots, stopped sweeps, aircraft."""

from __future__ import annotations

from service.contract.evaluation import EvaluationResult
from service.web import present
from service.web.numbers import plain
from service.web.report_blocks import Block, down, heading, paragraph, reached, table, up

__all__ = ["besides_blocks"]


def besides_blocks(result: EvaluationResult) -> list[Block]:
    """The lit spot, the stopped sweep, the sky."""
    blocks: list[Block] = []
    if result.diffuse is not None:
        found = result.diffuse
        rows = [
            [
                str(s.line + 1),
                f"{down(s.spot_mm[0])} × {down(s.spot_mm[1])} mm",
                down(s.subtense_mrad, "mrad"),
            ]
            for s in found.lines
        ]
        day = "may" if found.safe_all_day else "must not"
        far = found.day_hazard_distance_m
        reach = "at every distance" if far is None else f"out to {up(far, 'm')}" if far else "nowhere"
        blocks += [
            heading("The lit spot", 2),
            table(["Line", "Width of the spot", "Subtense at the worst place"], rows, [0.5, 1.5, 1.5]),
            paragraph(
                f"One {day} look at the spot all day ({plain(found.day_s)} s): at most "
                f"{up(found.day_hazard_ratio)} times the limit, above it {reach}. Looked at from "
                f"{plain(found.nearest_m)} m on, {plain(round(found.viewing_deg, 6))}° from the normal."
            ),
        ]
    if result.scan is not None:
        cases = {
            "Eye": result.scan.failure_eye,
            "Skin": result.scan.failure_skin,
            "Eye with optics": result.scan.failure_eye_aided,
        }
        names = [name for name, target in cases.items() if target is not None]
        stopped = [target for target in cases.values() if target is not None]
        rows = [
            ["Hazard distance", *(reached(t.hazard_distance_m) for t in stopped)],
            ["Exposure / limit at the worst place", *(up(t.hazard_ratio) for t in stopped)],
            ["Optical density needed", *(up(t.optical_density) for t in stopped)],
        ]
        blocks += [heading("When the sweep stops", 2), table(["", *names], rows, [1.3] + [1.0] * len(names))]
    if result.airspace is not None:
        sky = result.airspace
        rows = [
            [
                z.name,
                down(z.level_w_m2, "W/m²"),
                reached(z.distance_m),
                z.extent,
                f"{z.source}; {present.KNOWN[z.known]}",
            ]
            for z in sky.zones
        ]
        head = ["Zone", "Level", "Exceeded out to", "Extent", "Source"]
        blocks += [
            heading("Aircraft", 2),
            paragraph(f"Visual power {up(sky.visual_power_w, 'W')}. {sky.reminder}"),
            table(head, rows, [1.2, 0.9, 0.9, 2.0, 1.6]),
        ]
    return blocks
