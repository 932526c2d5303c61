"""Idempotency-Key: the same request twice is done once and answered alike."""

from __future__ import annotations

from dataclasses import dataclass

import sqlalchemy as sa

from service.register.actor import Actor
from service.register.clock import in_future, now
from service.register.figures import digest_of
from service.register.problems import KeyReused
from service.register.schema import replies

__all__ = ["Reply", "earlier", "keep"]

#: How long an answer is kept [s].
KEPT_S = 24 * 3600.0


@dataclass(frozen=True, slots=True)
class Reply:
    """The answer to a creation."""

    body: str
    location: str


def earlier(connection: sa.Connection, actor: Actor, key: str | None, request: str) -> Reply | None:
    """The answer given before under this key. Raises KeyReused where it was for another request."""
    if key is None:
        return None
    query = sa.select(replies).where(
        replies.c.actor == actor.name, replies.c.key == key, replies.c.created_at > in_future(-KEPT_S)
    )
    row = connection.execute(query).mappings().first()
    if row is None:
        return None
    if row["request_digest"] != digest_of(request):
        raise KeyReused("this Idempotency-Key came with another request before; make a new key")
    return Reply(row["body"], row["location"])


def keep(connection: sa.Connection, actor: Actor, key: str | None, request: str, reply: Reply) -> None:
    """Keep the answer under the key, in the transaction of the creation; old ones are swept away."""
    if key is None:
        return
    connection.execute(sa.delete(replies).where(replies.c.created_at <= in_future(-KEPT_S)))
    connection.execute(
        sa.insert(replies).values(
            actor=actor.name,
            key=key,
            request_digest=digest_of(request),
            body=reply.body,
            location=reply.location,
            created_at=now(),
        )
    )
