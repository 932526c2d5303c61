"""Users, passwords, sessions, API tokens and the throttling of failed sign-ins.

Passwords are kept as scrypt hashes, session and token secrets as SHA-256: none can be read back.
"""

from __future__ import annotations

import base64
import hashlib
import hmac
import secrets
from collections.abc import Mapping
from functools import cache
from typing import Annotated, Any

import sqlalchemy as sa
from pydantic import Field

from service.contract.problem import InvalidRequest, NotFound
from service.contract.result import Model
from service.contract.strict import Strict
from service.register.actor import SCOPES, Actor, Role
from service.register.audit import Entry, record
from service.register.clock import in_future, now, seconds_since
from service.register.models import Tag
from service.register.problems import Conflict, Forbidden, TooManyAttempts, field_error
from service.register.schema import attempts, sessions, tokens, users
from service.register.stored import MOST

__all__ = [
    "SESSION_S",
    "TokenIn",
    "TokenInfo",
    "User",
    "UserIn",
    "actor_of_session",
    "actor_of_token",
    "actor_of_user",
    "add_user",
    "change_user",
    "check_password",
    "close_session",
    "delay",
    "failed",
    "make_token",
    "open_session",
    "revoke_token",
    "set_password",
    "tokens_of",
    "users_list",
]

#: Cost of scrypt, a power of two: 32 MiB of memory, about 0.1 s.
COST = 15
LEAST_PASSWORD, MOST_PASSWORD = 12, 200
SESSION_S = 12 * 3600.0
#: Failures that are free, the first wait [s], the longest wait [s].
FREE, FIRST_S, LONGEST_S = 5, 5.0, 900.0
PREFIX = "blk_"
TOKEN_COLUMNS = (tokens.c.digest, tokens.c.scope, tokens.c.expires_at)


class UserIn(Strict):
    """A user; blank password: sign-in by header or token only."""

    name: Tag
    role: Role
    active: bool = True
    password: Annotated[str, Field(max_length=200)] | None = None


class User(Model):
    """A user, without any secret."""

    id: int
    name: str
    role: Role
    active: bool
    has_password: bool
    created_at: str


class TokenIn(Strict):
    """An API token to make."""

    name: Tag = Field(description="What the token is for.")
    scope: str = Field(description="read, write, approve or admin; the role limits it too.")
    days: int | None = Field(None, ge=1, le=3650, description="Days until it expires; null = never.")


class TokenInfo(Model):
    """A token, without its secret."""

    id: int
    name: str
    scope: str
    created_at: str
    expires_at: str | None
    revoked_at: str | None


def _hashed(password: str, cost: int, salt: bytes) -> str:
    """The hash with the cost and the salt that made it: scrypt$cost$salt$hash."""
    digest = hashlib.scrypt(
        password.encode(), salt=salt, n=2**cost, r=8, p=1, maxmem=2 ** (cost + 11), dklen=32
    )
    return f"scrypt${cost}${base64.b64encode(salt).decode()}${base64.b64encode(digest).decode()}"


def _secret(secret: str) -> str:
    return hashlib.sha256(secret.encode()).hexdigest()


@cache
def _nobody() -> str:
    """What a password of an unknown user is held against, so that both take the same time."""
    return _hashed(secrets.token_urlsafe(), COST, secrets.token_bytes(16))


def check_password(stored: str | None, password: str) -> bool:
    """Whether a password is the one that was stored; takes as long where none was."""
    kept = stored or _nobody()
    _, cost, salt, _ = kept.split("$")
    given = _hashed(password[:MOST_PASSWORD], int(cost), base64.b64decode(salt))
    return hmac.compare_digest(given, kept) and stored is not None


def _new_password(password: str) -> str:
    if not LEAST_PASSWORD <= len(password) <= MOST_PASSWORD:
        message = "too short" if len(password) < LEAST_PASSWORD else "too long"
        allowed = f"{LEAST_PASSWORD} to {MOST_PASSWORD} characters"
        error = field_error("password", None, allowed, message, "Take another one.")
        raise InvalidRequest(f"password: {message}", [error])
    return _hashed(password, COST, secrets.token_bytes(16))


def add_user(connection: sa.Connection, actor: Actor, body: UserIn) -> int:
    """Add a user; the id. Raises Conflict where the name is taken, InvalidRequest for a short password."""
    if _find(connection, body.name) is not None:
        raise Conflict(f"the name {body.name!r} is taken")
    values = {
        "name": body.name,
        "role": body.role,
        "password": _new_password(body.password) if body.password else None,
        "active": body.active,
        "version": 1,
        "created_at": now(),
    }
    found = int(connection.execute(sa.insert(users).values(values).returning(users.c.id)).scalar_one())
    record(connection, actor, Entry("user added", "user", found, {"name": body.name, "role": body.role}))
    return found


def change_user(
    connection: sa.Connection,
    actor: Actor,
    user_id: int,
    role: Role | None = None,
    active: bool | None = None,
) -> None:
    """Change role or activity; open sessions of the user end. Raises NotFound.

    Raises Conflict where no active admin would be left.
    """
    row = _user_row(connection, user_id)
    values = {"role": role or row["role"], "active": row["active"] if active is None else active}
    changed = {k: {"from": row[k], "to": v} for k, v in values.items() if row[k] != v}
    if not changed:
        return
    connection.execute(
        sa.update(users).where(users.c.id == user_id).values(**values, version=row["version"] + 1)
    )
    was_admin = row["role"] == "admin" and row["active"]
    left = connection.execute(
        sa.select(sa.func.count()).select_from(users).where(users.c.role == "admin", users.c.active.is_(True))
    ).scalar_one()
    if was_admin and not left:
        raise Conflict(f"{row['name']!r} is the last admin; make another one first")
    connection.execute(sa.delete(sessions).where(sessions.c.user_id == user_id))
    record(
        connection, actor, Entry("user changed", "user", user_id, {"name": row["name"], "changed": changed})
    )


def set_password(connection: sa.Connection, actor: Actor, user_id: int, password: str) -> None:
    """Set a new password; open sessions of the user end. Raises NotFound, InvalidRequest."""
    row = _user_row(connection, user_id)
    hashed = _new_password(password)
    connection.execute(
        sa.update(users).where(users.c.id == user_id).values(password=hashed, version=row["version"] + 1)
    )
    connection.execute(sa.delete(sessions).where(sessions.c.user_id == user_id))
    record(connection, actor, Entry("password set", "user", user_id, {"name": row["name"]}))


def users_list(connection: sa.Connection) -> list[User]:
    """Every user by name."""
    rows = connection.execute(sa.select(users).order_by(users.c.name)).mappings()
    return [_user(r) for r in rows]


def _user(row: Mapping[Any, Any]) -> User:
    plain = {k: row[k] for k in ("id", "name", "role", "active", "created_at")}
    return User(**plain, has_password=row["password"] is not None)


def _user_row(connection: sa.Connection, user_id: int) -> Any:
    known = sa.select(users).where(users.c.id == min(user_id, MOST))
    row = connection.execute(known).mappings().first()
    if row is None or row["id"] != user_id:
        raise NotFound(f"there is no user {user_id}")
    return row


def _find(connection: sa.Connection, name: str) -> Any:
    return connection.execute(sa.select(users).where(users.c.name == name)).mappings().first()


def actor_of_user(
    connection: sa.Connection, name: str, via: str, password: str | None = None
) -> Actor | None:
    """The active user of this name as an actor; with a password only if it is right."""
    row = _find(connection, name)
    if password is not None and not check_password(row["password"] if row else None, password):
        return None
    if row is None or not row["active"]:
        return None
    return Actor(row["name"], row["role"], via, user_id=row["id"])


def open_session(connection: sa.Connection, actor: Actor) -> str:
    """Begin a session; the secret of its cookie. Sessions that ended are swept away."""
    secret = secrets.token_urlsafe(32)
    connection.execute(sa.delete(sessions).where(sessions.c.expires_at < now()))
    connection.execute(
        sa.insert(sessions).values(
            digest=_secret(secret), user_id=actor.user_id, created_at=now(), expires_at=in_future(SESSION_S)
        )
    )
    record(connection, actor, Entry("signed in", "user", actor.user_id or 0))
    return secret


def close_session(connection: sa.Connection, secret: str) -> None:
    """End a session."""
    connection.execute(sa.delete(sessions).where(sessions.c.digest == _secret(secret)))


def actor_of_session(connection: sa.Connection, secret: str) -> Actor | None:
    """Who is signed in with this cookie."""
    query = (
        sa.select(users)
        .join(sessions, sessions.c.user_id == users.c.id)
        .where(sessions.c.digest == _secret(secret), sessions.c.expires_at > now(), users.c.active.is_(True))
    )
    row = connection.execute(query).mappings().first()
    return None if row is None else Actor(row["name"], row["role"], "session", user_id=row["id"])


def make_token(connection: sa.Connection, actor: Actor, body: TokenIn) -> tuple[int, str]:
    """Make an API token of one's own; id and secret, which is shown once.

    Raises InvalidRequest for an unknown scope, Forbidden for a wider one, Conflict without an account.
    """
    if body.scope not in SCOPES:
        error = field_error("scope", body.scope, ", ".join(SCOPES), "unknown scope", "Choose one of those.")
        raise InvalidRequest("scope: unknown scope", [error])
    if not actor.may(SCOPES[body.scope]):
        raise Forbidden(f"a token of scope {body.scope} reaches farther than you do")
    if actor.user_id is None:
        raise Conflict("tokens belong to user accounts; there is none without sign-in")
    secret = PREFIX + secrets.token_urlsafe(32)
    values = {
        "user_id": actor.user_id,
        "name": body.name,
        "digest": _secret(secret),
        "scope": body.scope,
        "created_at": now(),
        "expires_at": None if body.days is None else in_future(body.days * 86400.0),
    }
    found = int(connection.execute(sa.insert(tokens).values(values).returning(tokens.c.id)).scalar_one())
    detail = {"name": body.name, "scope": body.scope, "expires_at": values["expires_at"]}
    record(connection, actor, Entry("token made", "token", found, detail))
    return found, secret


def revoke_token(connection: sa.Connection, actor: Actor, token_id: int) -> None:
    """Revoke a token: one's own, or anybody's as admin. Raises NotFound."""
    known = sa.select(tokens).where(tokens.c.id == min(token_id, MOST))
    row = connection.execute(known).mappings().first()
    if row is None or (row["user_id"] != actor.user_id and not actor.may("admin")):  # others' stay unseen
        raise NotFound(f"there is no token {token_id} of yours")
    if row["revoked_at"] is None:
        connection.execute(sa.update(tokens).where(tokens.c.id == token_id).values(revoked_at=now()))
        record(connection, actor, Entry("token revoked", "token", token_id, {"name": row["name"]}))


def tokens_of(connection: sa.Connection, user_id: int | None) -> list[TokenInfo]:
    """Tokens of a user, the newest first."""
    query = sa.select(tokens).where(tokens.c.user_id == user_id).order_by(tokens.c.id.desc())
    names = TokenInfo.model_fields
    return [TokenInfo(**{k: r[k] for k in names}) for r in connection.execute(query).mappings()]


def actor_of_token(connection: sa.Connection, secret: str) -> Actor | None:
    """Who acts with this token."""
    query = (
        sa.select(
            users.c.id, users.c.name, users.c.role, tokens.c.digest, tokens.c.scope, tokens.c.expires_at
        )
        .join(tokens, tokens.c.user_id == users.c.id)
        .where(tokens.c.digest == _secret(secret), tokens.c.revoked_at.is_(None), users.c.active.is_(True))
    )
    row = connection.execute(query).mappings().first()
    if row is None or not hmac.compare_digest(row["digest"], _secret(secret)):
        return None
    if row["expires_at"] is not None and row["expires_at"] < now():
        return None
    return Actor(row["name"], row["role"], "token", SCOPES[row["scope"]], row["id"])


def delay(connection: sa.Connection, keys: list[str]) -> None:
    """Raises TooManyAttempts where a name or an address has to wait."""
    for row in connection.execute(sa.select(attempts).where(attempts.c.key.in_(keys))).mappings():
        over = row["failures"] - FREE
        wait = min(FIRST_S * 2.0 ** min(over, 20), LONGEST_S) if over >= 0 else 0.0
        left = wait - seconds_since(row["last_at"])
        if left > 0.0:
            raise TooManyAttempts(
                f"too many failed sign-ins; wait {int(left) + 1} s", {"retry-after": str(int(left) + 1)}
            )


def failed(connection: sa.Connection, keys: list[str], right: bool) -> None:
    """Count a failed sign-in, or forget the failures of a name after a right one."""
    for key in keys:
        row = connection.execute(sa.select(attempts).where(attempts.c.key == key)).mappings().first()
        if right:
            connection.execute(sa.delete(attempts).where(attempts.c.key == key))
        elif row is None:
            connection.execute(sa.insert(attempts).values(key=key, failures=1, last_at=now()))
        else:
            # After a day without a failure the count begins anew.
            count = 1 if seconds_since(row["last_at"]) > 86400.0 else row["failures"] + 1
            values = {"failures": count, "last_at": now()}
            connection.execute(sa.update(attempts).where(attempts.c.key == key).values(values))
