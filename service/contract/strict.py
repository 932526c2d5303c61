"""What every part of the request has in common."""

from __future__ import annotations

from pydantic import BaseModel, ConfigDict

__all__ = ["Strict"]


class Strict(BaseModel):
    """Refuses unknown fields, text for numbers, NaN and infinity; cannot be changed afterwards."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)
