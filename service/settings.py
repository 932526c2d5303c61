"""Settings from the environment: every name starts with BLINKLINE_."""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass, fields
from ipaddress import ip_network

from service.logs import FORMS
from service.register.database import database_url

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
    "sign_in": (re.compile(r"off|password|header"), "off, password or header"),
    "four_eyes": (re.compile(r"on|off"), "on or off"),
    "user_header": (re.compile(r"[!#$%&'*+.^_`|~0-9A-Za-z-]+"), "the name of a header"),
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
    `allowed_hosts`: host names served, separated by commas; blank = any. `request_time`: longest time for
    head and body to arrive, and for a part of an answer to be taken [s]. `running_limit`: most requests
    computed at a time, `rate_limit`: most requests of one address a minute (0 = any); both per process.
    For the register: `data_dir`: its folder (blank: per user). `database`: PostgreSQL address instead.
    `sign_in`: off, password or header. `proxies`: addresses of reverse proxies, parted by commas.
    `user_header`: header in which such a proxy names the user. `import_limit`: largest CSV file [bytes].
    `four_eyes`: on = who submitted a revision cannot approve it.
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
    allowed_hosts: str = ""
    request_time: int = 30
    running_limit: int = 100
    rate_limit: int = 0
    data_dir: str = ""
    database: str = ""
    sign_in: str = "off"
    proxies: str = ""
    user_header: str = "x-remote-user"
    import_limit: int = 20_000_000
    four_eyes: str = "off"

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
            least = 0 if field.name == "rate_limit" else 1
            if not text.isdecimal() or not least <= int(text) <= top:
                raise SettingsError(f"{name} is {text!r}, expected a whole number from {least} to {top}")
            values[field.name] = int(text)
        return cls(**values)._checked()  # type: ignore[arg-type]

    def _checked(self) -> Settings:
        """Itself. Raises SettingsError where texts do not go together."""
        for address in self.proxy_addresses:
            try:
                ip_network(address, strict=False)
            except ValueError:
                raise SettingsError(f"BLINKLINE_PROXIES holds {address!r}, which is no address") from None
        if self.sign_in == "header" and not self.proxies:
            raise SettingsError("BLINKLINE_SIGN_IN is 'header', so BLINKLINE_PROXIES must name the proxy")
        try:
            database_url(self.database, self.data_dir)
        except ValueError as error:
            raise SettingsError(f"BLINKLINE_DATABASE cannot be used: {error}") from None
        return self

    @property
    def proxy_addresses(self) -> list[str]:
        """Addresses or networks of the reverse proxies."""
        return [a.strip() for a in self.proxies.split(",") if a.strip()]
