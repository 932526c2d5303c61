"""The bodies that the register's API takes, for the OpenAPI document."""

from __future__ import annotations

from pydantic import BaseModel

from service.register.accounts import TokenIn, UserIn
from service.register.models import DecisionIn, EyewearIn, LaserIn, ReviewIn
from service.web.register.api_admin import UserChange
from service.web.register.api_lasers import EvaluateAnewIn
from service.web.register.api_shelf import AdoptIn

__all__ = ["BODIES"]

REVISION = "/api/v1/lasers/{laser_id}/revisions/{number}"
#: Method and path, and the model of the body.
BODIES: dict[tuple[str, str], type[BaseModel]] = {
    ("post", "/api/v1/lasers"): LaserIn,
    ("put", "/api/v1/lasers/{laser_id}"): LaserIn,
    ("put", "/api/v1/lasers/{laser_id}/review"): ReviewIn,
    ("post", "/api/v1/lasers/{laser_id}/evaluate-anew"): EvaluateAnewIn,
    ("post", f"{REVISION}/submit"): DecisionIn,
    ("post", f"{REVISION}/withdraw"): DecisionIn,
    ("post", f"{REVISION}/approve"): DecisionIn,
    ("post", f"{REVISION}/return"): DecisionIn,
    ("post", "/api/v1/eyewear"): EyewearIn,
    ("put", "/api/v1/eyewear/{eyewear_id}"): EyewearIn,
    ("post", "/api/v1/reevaluations/{run_id}/adopt"): AdoptIn,
    ("post", "/api/v1/users"): UserIn,
    ("put", "/api/v1/users/{user_id}"): UserChange,
    ("post", "/api/v1/tokens"): TokenIn,
}
