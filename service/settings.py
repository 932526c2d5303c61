"""Settings from the environment: every name starts with BLINKLINE_."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, fields

__all__ = ["Settings", "SettingsError"]


class SettingsError(ValueError):
    """A setting cannot be used; the message names it and what it may hold."""


@dataclass(frozen=True, slots=True)
class Settings:
    """What an operator may set.

    `host`, `port`: where `blinkline serve` listens. `body_limit`: largest request body read [bytes],
    `image_limit`: the same for calls and forms that carry an image.
    """

    host: str = "127.0.0.1"
    port: int = 8321
    body_limit: int = 1_000_000
    image_limit: int = 32_000_000

    @classmethod
    def from_environment(cls, environment: Mapping[str, str] = os.environ) -> Settings:
        """Read the settings. Raises SettingsError on an unknown name or a value that does not parse."""
        known = {f"BLINKLINE_{f.name.upper()}": f for f in fields(cls)}
        values: dict[str, str | int] = {}
        for name, text in environment.items():
            if not name.startswith("BLINKLINE_"):
                continue
            if name not in known:
                raise SettingsError(f"{name} is no setting; there are {', '.join(sorted(known))}")
            field = known[name]
            if field.name == "host":
                values["host"] = text
                continue
            top = 65535 if field.name == "port" else 1_000_000_000
            if not text.isdecimal() or not 1 <= int(text) <= top:
                raise SettingsError(f"{name} is {text!r}, expected a whole number from 1 to {top}")
            values[field.name] = int(text)
        return cls(**values)  # type: ignore[arg-type]
