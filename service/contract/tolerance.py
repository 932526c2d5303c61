"""Tolerances: the request and the answer."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import ConfigDict, Field, model_validator

from service.contract.request import EvaluationRequest, Strict
from service.contract.result import Model, Notice

__all__ = [
    "Chance",
    "Distribution",
    "Figures",
    "Histogram",
    "Influence",
    "Tolerance",
    "ToleranceRequest",
    "ToleranceResult",
    "WorstCase",
]

MAX_TOLERANCES = 40
MAX_DRAWS = 400_000


class Tolerance(Strict):
    """How far a figure may lie from its value: +/- per cent, +/- an amount, or from a low to a high value.

    `uniform`: any value within is as likely, none lies outside. `normal`: the interval covers 95 % (two
    standard deviations); values up to three standard deviations away are judged.
    """

    field: str = Field(max_length=100, description="Path in the evaluation, as lines.0.emission.power_w.")
    plus_minus_percent: float | None = Field(None, ge=0, le=1e4, description="+/- per cent of the value.")
    plus_minus: float | None = Field(None, ge=0, le=1e12, description="+/- in the unit of the field.")
    low: float | None = Field(None, ge=-1e12, le=1e12, description="Lowest value; give high too.")
    high: float | None = Field(None, ge=-1e12, le=1e12, description="Highest value; give low too.")
    meaning: Literal["uniform", "normal"] = "uniform"

    @model_validator(mode="after")
    def _one_of_three(self) -> Tolerance:
        both = self.low is not None and self.high is not None
        given = [self.plus_minus_percent is not None, self.plus_minus is not None, both]
        if sum(given) != 1 or (not both and (self.low is not None or self.high is not None)):
            raise ValueError("give plus_minus_percent, plus_minus, or low and high")
        if self.low is not None and self.high is not None and self.low > self.high:
            raise ValueError("low lies above high")
        return self


class ToleranceRequest(Strict):
    """An evaluation whose figures carry tolerances."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "evaluation": {
                        "lines": [
                            {
                                "wavelength_nm": 532,
                                "emission": {"mode": "cw", "power_w": 0.1},
                                "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
                            }
                        ]
                    },
                    "tolerances": [
                        {
                            "field": "lines.0.emission.power_w",
                            "plus_minus_percent": 10,
                            "meaning": "uniform",
                        },
                        {"field": "lines.0.beam.divergence_mrad", "plus_minus": 0.2, "meaning": "normal"},
                    ],
                    "draws": 100000,
                    "seed": 1,
                }
            ]
        }
    )

    evaluation: EvaluationRequest
    tolerances: list[Tolerance] = Field(
        min_length=1, max_length=MAX_TOLERANCES, description="One for each figure that is not exact."
    )
    draws: int | None = Field(
        None,
        ge=100,
        le=MAX_DRAWS,
        description="Number of draws; left out: 100,000, fewer where each takes long (elliptical beams, "
        "several waists).",
    )
    seed: int = Field(1, ge=0, le=2**53, description="Start of the random numbers: same seed, same answer.")


class Figures(Model):
    """An evaluation in short; distances: 0 = nothing exceeded, null = unbounded."""

    eye_hazard_distance_m: float | None
    eye_hazard_ratio: float
    eye_optical_density: float
    skin_hazard_distance_m: float | None
    skin_hazard_ratio: float
    skin_optical_density: float
    classes: dict[str, str] = Field(description="Hazard class by scheme.")


class WorstCase(Figures):
    """The worst of everything that the tolerances allow, each figure for itself."""

    at: dict[str, float] = Field(description="The figures at which the eye hazard distance is longest.")
    evaluation: dict[str, Any] = Field(description="The evaluation there: body for POST /api/v1/evaluate.")
    proven: list[str] = Field(description="Fields that went to the end which is never the safer one.")
    searched: list[str] = Field(
        description="Fields tried at both ends, at every boundary of the tables between, and in between."
    )
    corners: int = Field(description="Corners judged.")


class Histogram(Model):
    """Counts of draws between edges."""

    edges: list[float]
    counts: list[int]


class Distribution(Model):
    """One figure over all draws; infinite values are null and counted by `unbounded`."""

    figure: str
    mean: float | None
    standard_deviation: float | None
    median: float | None
    interval_95: tuple[float | None, float | None] = Field(
        description="Probabilistically symmetric 95 % coverage interval, widened to whole draws."
    )
    greatest: float | None
    unbounded: float = Field(description="Share of draws without an end.")
    histogram: Histogram | None


class Chance(Model):
    """Share of the draws that fall in a class."""

    scheme: str
    hazard_class: str
    share: float


class Influence(Model):
    """How much one figure matters."""

    field: str
    rank: int
    share: float = Field(description="Share of the squared rank correlations with the ranked figure.")
    low: float
    high: float
    at_low: Figures = Field(description="This figure at its low end, the others as given.")
    at_high: Figures


class ToleranceResult(Model):
    """Nominal, guaranteed worst case, and the distribution of what lies between."""

    nominal: Figures
    worst_case: WorstCase
    distributions: list[Distribution]
    classes: list[Chance]
    influence: list[Influence] = Field(description="What matters most first.")
    ranked_by: str = Field(description="The figure by which the inputs are ranked.")
    inputs: dict[str, Any]
    notices: list[Notice]
    cautions: list[str]
    service_version: str
    rules_digest: str
