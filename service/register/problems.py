"""Problems of the register.

Problem
 +-- Conflict            409  what is asked for does not go with the state it is in
 +-- StaleVersion        412  somebody else changed it in the meantime
 +-- VersionNeeded       428  a change without If-Match could overwrite one of somebody else
 +-- KeyReused           422  an Idempotency-Key came back with another body
 +-- SignInNeeded        401  nobody is signed in, or the token is not valid
 +-- Forbidden           403  the role or the token does not reach that far, or the form is foreign
 +-- TooManyAttempts     429  too many failed sign-ins
 +-- RegisterUnavailable 503  the register cannot be read or written; nothing was changed
"""

from __future__ import annotations

from service.contract.problem import FieldError, Problem

__all__ = [
    "TEXTS",
    "Conflict",
    "Forbidden",
    "KeyReused",
    "RegisterProblem",
    "RegisterUnavailable",
    "SignInNeeded",
    "StaleVersion",
    "TooManyAttempts",
    "VersionNeeded",
    "field_error",
]


class RegisterProblem(Problem):
    """A problem that may carry headers of its answer."""

    def __init__(self, detail: str, headers: dict[str, str] | None = None) -> None:
        super().__init__(detail)
        self.headers = headers or {}


class Conflict(RegisterProblem):
    """What is asked for does not go with the state it is in."""

    slug = "conflict"
    title = "This does not go with the state of the record"
    status = 409


class StaleVersion(RegisterProblem):
    """Somebody else changed it in the meantime."""

    slug = "stale-version"
    title = "Somebody else changed this in the meantime"
    status = 412


class VersionNeeded(RegisterProblem):
    """A change without If-Match could overwrite one of somebody else."""

    slug = "version-needed"
    title = "The version that is to be changed is not named"
    status = 428


class KeyReused(RegisterProblem):
    """An Idempotency-Key came back with another body."""

    slug = "key-reused"
    title = "This Idempotency-Key was used for something else"
    status = 422


class SignInNeeded(RegisterProblem):
    """Nobody is signed in, or the token is not valid."""

    slug = "sign-in-needed"
    title = "Sign in first"
    status = 401


class Forbidden(RegisterProblem):
    """The role or the token does not reach that far, or the form is foreign."""

    slug = "forbidden"
    title = "This is not allowed"
    status = 403


class TooManyAttempts(RegisterProblem):
    """Too many failed sign-ins."""

    slug = "too-many-attempts"
    title = "Too many failed sign-ins"
    status = 429


class RegisterUnavailable(RegisterProblem):
    """The register cannot be read or written; nothing was changed."""

    slug = "register-unavailable"
    title = "The register cannot be used just now"
    status = 503


TEXTS = {
    "conflict": "The record is in a state in which this cannot be done, or its name is taken. The detail "
    "says which. Nothing was changed.",
    "stale-version": "The record was changed after you read it. Read it again, look at the change, and send "
    "yours with the new ETag in If-Match. Nothing was changed.",
    "version-needed": "Send the ETag of the record you read in the header If-Match, so that a change of "
    "somebody else cannot be lost.",
    "key-reused": "An Idempotency-Key stands for one request. Make a new key for a new request.",
    "sign-in-needed": "Sign in on the page, or send a valid API token in the header Authorization: Bearer.",
    "forbidden": "Your role, or the scope of the token, does not reach that far; or the form did not come "
    "from this service. An admin can change roles.",
    "too-many-attempts": "After several failed sign-ins the name and the address must wait. Retry-After "
    "says how many seconds.",
    "register-unavailable": "The register's database cannot be read or written: the detail says why. Nothing "
    "was changed. Evaluations work without the register.",
}


def field_error(field: str, value: object, allowed: str, message: str, remedy: str) -> FieldError:
    """An error of one field, the value short."""
    shown = value if value is None or isinstance(value, int | float) else str(value)[:120]
    return FieldError(field=field[:120], value=shown, allowed=allowed, message=message, remedy=remedy)
