"""The tables that there is one of: the site, the store, listening, the dashboard."""

from __future__ import annotations

import ipaddress
import zoneinfo
from typing import Literal

from pydantic import Field, field_validator

from ginnel.config.section import Section
from ginnel.words import Site


class SiteSettings(Section):
    """``[site]``: the place; its zone rules what an hour and a day are."""

    name: str = Field(default="Unnamed site", min_length=1, max_length=200)
    timezone: str = "UTC"

    @field_validator("timezone")
    @classmethod
    def _known_zone(cls, name: str) -> str:
        try:
            zoneinfo.ZoneInfo(name)
        except (zoneinfo.ZoneInfoNotFoundError, ValueError, OSError) as exc:
            raise ValueError("not an IANA time zone such as Europe/Dublin") from exc
        return name

    def to_site(self) -> Site:
        """Give the site as the store and the reports need it."""
        return Site(name=self.name, timezone=self.timezone)


class StoreSettings(Section):
    """``[store]``: where the log is kept."""

    url: str = Field(default="sqlite:///ginnel.db", pattern=r"^(sqlite|postgresql(\+psycopg)?)://")


class ListenSettings(Section):
    """``[listen]``: what the daemon keeps beside the store, and when it writes to the store."""

    state: str = Field(default="listening", min_length=1)
    store_every_s: float = Field(default=60.0, ge=1, le=600)
    trust_clock: Literal["when-set", "always"] = "when-set"


class WebSettings(Section):
    """``[web]``: how the dashboard is reached, and how it writes numbers."""

    address: str = "127.0.0.1"
    port: int = Field(default=8470, ge=0, le=65535)
    public_url: str | None = Field(default=None, pattern=r"^https?://[A-Za-z0-9.\[\]:-]+(/[^?#\s]*)?$")
    units: Literal["m/s", "km/h", "mph"] = "m/s"
    locale: str = "en"
    speed_limit: float | None = Field(default=None, gt=0, le=400)  # in the unit above

    @field_validator("address")
    @classmethod
    def _an_address(cls, text: str) -> str:
        try:
            ipaddress.ip_address(text)
        except ValueError as exc:
            raise ValueError("not an IP address such as 127.0.0.1 or 0.0.0.0") from exc
        return text

    @field_validator("locale")
    @classmethod
    def _known_locale(cls, name: str) -> str:
        from babel import Locale, UnknownLocaleError

        try:
            return str(Locale.parse(name.replace("-", "_")))
        except (UnknownLocaleError, ValueError) as exc:
            raise ValueError("not a locale such as en-IE or de") from exc
