"""Settings from the environment: every name starts with BLINKLINE_."""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass, fields

from service.logs import FORMS

__all__ = ["Settings", "SettingsError"]

ANY = re.compile(r".*", re.DOTALL)
#: Settings that only some texts fit, with those in words.
TEXTS = {
    "log": (re.compile("|".join(FORMS)), f"one of {', '.join(FORMS)}"),
    "public_address": (
        re.compile(r"(https?://[!-~]*[!-.0-~])?"),
        "an http or https address without a last /",
    ),
    "sign_policy": (re.compile(r"standard|strict"), "standard or strict"),
    "lso_name": (re.compile(r"[^\n\t]{0,80}"), "one line of at most 80 characters"),
    "lso_phone": (re.compile(r"[^\n\t]{0,40}"), "one line of at most 40 characters"),
}


class SettingsError(ValueError):
    """A setting cannot be used; the message names it and what it may hold."""


@dataclass(frozen=True, slots=True)
class Settings:
    """What an operator may set.

    `host`, `port`: where `blinkline serve` listens. `body_limit`: largest request body read [bytes],
    `bulk_body_limit` that of `evaluate/bulk`, unpacked, `image_limit` that of calls and forms that carry an
    image. `log`: text or json.
    For signs: `public_address`: where people reach this service (blank: as the request says);
    `sign_policy`: signal words by the class (`standard`) or DANGER for every 3B and 4 (`strict`);
    `lso_name`, `lso_phone`: laser safety officer of the site.
    """

    host: str = "127.0.0.1"
    port: int = 8321
    body_limit: int = 1_000_000
    bulk_body_limit: int = 50_000_000
    image_limit: int = 32_000_000
    log: str = "text"
    public_address: str = ""
    sign_policy: str = "standard"
    lso_name: str = ""
    lso_phone: str = ""

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
            if isinstance(field.default, str):
                pattern, words = TEXTS.get(field.name, (ANY, ""))
                if not pattern.fullmatch(text):
                    raise SettingsError(f"{name} is {text!r}, expected {words}")
                values[field.name] = text
                continue
            top = 65535 if field.name == "port" else 1_000_000_000
            if not text.isdecimal() or not 1 <= int(text) <= top:
                raise SettingsError(f"{name} is {text!r}, expected a whole number from 1 to {top}")
            values[field.name] = int(text)
        return cls(**values)  # type: ignore[arg-type]
