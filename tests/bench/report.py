"""Time of a chart, a sweep and a report beside that of a single answer, from one run.

Run with ``python -m tests.bench.report``. Nothing is asserted, because a time depends on the machine.
"""

from __future__ import annotations

import sys
from datetime import date

from service.contract.answer import answer
from service.contract.report import ReportRequest
from service.contract.request import EvaluationRequest
from service.contract.sweep import SweepRequest, sweep
from service.web.chart import chart_of
from service.web.report import report_pdf
from service.web.templates import environment
from tests.bench.speed import best
from tests.web.client import GOOD

POINTS = 2000


def main() -> None:
    """Measure and print."""
    request = EvaluationRequest.model_validate(GOOD)
    asked = {"field": "wavelength_nm", "start": 180.0, "stop": 20000.0, "points": POINTS}
    running = SweepRequest.model_validate({"evaluation": GOOD, "sweep": asked})
    paper = ReportRequest.model_validate({"evaluation": GOOD})
    day = date(2026, 12, 1)
    result = answer(request)
    template = environment().get_template("chart.svg")
    single = best(lambda: answer(request), 20)
    rows = [
        ("single answer", single),
        ("chart: places, curves, readings", best(lambda: chart_of(result), 10)),
        ("chart: drawing", best(lambda: template.render(plot=chart_of(result).plot), 10)),
        (f"sweep of {POINTS} values", best(lambda: sweep(running), 3)),
        ("report, a first time", best(lambda: report_pdf(paper, day), 1)),
        ("report, again", best(lambda: report_pdf(paper, day), 3)),
    ]
    for name, seconds in rows:
        sys.stdout.write(f"{name:36}{1e3 * seconds:9.1f} ms{seconds / single:9.1f} x a single answer\n")
    gain = POINTS * single / rows[3][1]
    sys.stdout.write(f"a sweep is {gain:.0f} times as fast as {POINTS} single answers\n")


if __name__ == "__main__":
    main()
