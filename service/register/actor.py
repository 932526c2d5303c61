"""Who acts: a name, a role, and how the person or program came in."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["PERMISSIONS", "ROLES", "SCOPES", "Actor", "Permission", "Role"]

Role = Literal["viewer", "editor", "approver", "admin"]
Permission = Literal["view", "edit", "approve", "admin"]
#: Each role may do what the ones before it may.
ROLES: tuple[Role, ...] = ("viewer", "editor", "approver", "admin")
PERMISSIONS: tuple[Permission, ...] = ("view", "edit", "approve", "admin")
#: Scopes of API tokens, by the farthest permission they give; the role of the owner limits them too.
SCOPES: dict[str, Permission] = {"read": "view", "write": "edit", "approve": "approve", "admin": "admin"}


@dataclass(frozen=True, slots=True)
class Actor:
    """Who acts.

    `via`: local (no sign-in), session, token, header or command. `limit`: the farthest permission of
    the token.
    """

    name: str
    role: Role
    via: str
    limit: Permission = "admin"
    user_id: int | None = None

    def may(self, permission: Permission) -> bool:
        """Whether role and token both reach that far."""
        asked = PERMISSIONS.index(permission)
        return asked <= ROLES.index(self.role) and asked <= PERMISSIONS.index(self.limit)
