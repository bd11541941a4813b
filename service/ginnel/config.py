"""The settings: ``ginnel.toml`` and ``GINNEL_*``, read once into a frozen tree.

The names are a contract with whoever wrote the file. A key that is not known and a value out of
range are errors, one line each, with the file, the line and the key. An environment variable wins over
the file: ``GINNEL_STORE__URL``, ``GINNEL_SENSOR__0__CARRIER_HZ`` (sensors count from 0), a list as JSON.
Relative paths in the file are meant from the file's own folder.
"""

from __future__ import annotations

import ipaddress
import json
import os
import tomllib
import zoneinfo
from collections.abc import Mapping
from datetime import datetime
from importlib import resources
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import (
    AwareDatetime,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    ValidationError,
    field_validator,
    model_validator,
)
from pydantic_settings import BaseSettings, PydanticBaseSettingsSource, SettingsConfigDict, SettingsError

from ginnel.config_errors import describe
from ginnel.errors import ConfigError
from ginnel.times import to_us
from ginnel.words import Aspect, Channels, Mounting, Sensor, Site

DEFAULT_FILE = Path("ginnel.toml")


def _listed(value: Any) -> Any:
    """Make a list from the environment's JSON, or from what was given there by number."""
    if isinstance(value, str) and value.lstrip().startswith("["):
        return json.loads(value)
    if isinstance(value, Mapping) and all(str(key).isdigit() for key in value):
        return [value[key] for key in sorted(value, key=int)]
    return value


_Listed = BeforeValidator(_listed)
_Degrees = Annotated[float, Field(gt=0, le=180)]
_BeamWidth = Annotated[tuple[_Degrees, _Degrees], _Listed]
_SpeedEdge = Annotated[float, Field(gt=0, le=100)]


class _Section(BaseModel):
    """A table of the file: unknown keys are errors, nothing changes after reading."""

    model_config = ConfigDict(extra="forbid", frozen=True)


class SiteSettings(_Section):
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


class StoreSettings(_Section):
    """``[store]``: where the log is kept."""

    url: str = Field(default="sqlite:///ginnel.db", pattern=r"^(sqlite|postgresql(\+psycopg)?)://")


class WebSettings(_Section):
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


class MountingChange(_Section):
    """``[[sensor.mounting_change]]``: what is different from a date on; the rest stays as it was."""

    since: AwareDatetime
    aspect: Aspect | None = None
    height_m: float | None = Field(default=None, ge=0, le=50)
    offset_m: float | None = Field(default=None, ge=-100, le=100)
    beam_angle_deg: float | None = Field(default=None, ge=0, le=90)
    tilt_deg: float | None = Field(default=None, ge=0, le=90)
    beam_width_deg: _BeamWidth | None = None


class MountingSettings(_Section):
    """``[sensor.mounting]``: how the sensor looks at the path."""

    aspect: Aspect = Aspect.AXIAL
    height_m: float = Field(default=2.4, ge=0, le=50)
    offset_m: float = Field(default=0.0, ge=-100, le=100)
    beam_angle_deg: float = Field(default=0.0, ge=0, le=90)
    tilt_deg: float = Field(default=0.0, ge=0, le=90)
    beam_width_deg: _BeamWidth | None = None
    since: AwareDatetime | None = None


class DirectionSettings(_Section):
    """``[sensor.directions]``: plain names for the two ways past the sensor."""

    approaching: str = Field(default="approaching", min_length=1, max_length=80)
    receding: str = Field(default="receding", min_length=1, max_length=80)

    @model_validator(mode="after")
    def _two_names(self) -> DirectionSettings:
        if self.approaching == self.receding:
            raise ValueError("approaching and receding need two different names")
        return self


class SourceSettings(_Section):
    """``[sensor.source]``: where samples come from."""

    kind: Literal["folder", "sound", "pipe", "tcp", "serial"] = "folder"
    path: str = "captures"


class SensorSettings(_Section):
    """``[[sensor]]``: one radar module."""

    name: str = Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]*$", max_length=64)
    carrier_hz: float = Field(default=10.525e9, ge=1e9, le=300e9)
    channels: Channels = Channels.MONO
    swap_iq: bool = False
    mains_hz: float = Field(default=50.0, ge=16, le=400)
    speed_bands_mps: Annotated[tuple[_SpeedEdge, ...], _Listed] = (0.5, 1.0, 1.5, 2.0, 3.0)
    min_speed_mps: float = Field(default=0.3, gt=0, le=100)
    max_speed_mps: float = Field(default=5.0, gt=0, le=100)
    highpass_hz: float | None = Field(default=None, gt=0, le=10_000)
    mounting: MountingSettings = MountingSettings()
    mounting_change: Annotated[tuple[MountingChange, ...], _Listed] = ()
    directions: DirectionSettings = DirectionSettings()
    source: SourceSettings = SourceSettings()

    @field_validator("speed_bands_mps")
    @classmethod
    def _ascending(cls, edges: tuple[float, ...]) -> tuple[float, ...]:
        if any(low >= high for low, high in pairwise(edges)):
            raise ValueError("edges must ascend, each larger than the one before")
        return edges

    @field_validator("mounting_change")
    @classmethod
    def _in_order(cls, changes: tuple[MountingChange, ...]) -> tuple[MountingChange, ...]:
        if any(a.since >= b.since for a, b in pairwise(changes)):
            raise ValueError("changes must be in order of their dates (since)")
        return changes

    @model_validator(mode="after")
    def _sound(self) -> SensorSettings:
        if self.min_speed_mps >= self.max_speed_mps:
            raise ValueError(
                f"min_speed_mps ({self.min_speed_mps:g}) must be below max_speed_mps ({self.max_speed_mps:g})"
            )
        if self.swap_iq and self.channels is Channels.MONO:
            raise ValueError('swap_iq needs channels = "iq"')
        first = self.mounting.since
        if first is not None and self.mounting_change and self.mounting_change[0].since <= first:
            raise ValueError("a mounting_change must be later than mounting.since")
        return self

    def mountings(self) -> tuple[Mounting, ...]:
        """Every mounting, oldest first, each complete."""
        current = self.mounting.model_dump()
        found = [current]
        for change in self.mounting_change:
            current = current | change.model_dump(exclude_none=True)
            found.append(current)
        return tuple(_mounting(values) for values in found)

    def to_sensor(self, at_us: int | None = None) -> Sensor:
        """Give the sensor as the measuring chain needs it, with the mounting of a moment.

        Parameters
        ----------
        at_us : int, microseconds since 1970 UTC, or None for the newest mounting
        """
        mountings = self.mountings()
        valid = [m for m in mountings if at_us is None or m.since_us is None or m.since_us <= at_us]
        return Sensor(
            name=self.name,
            carrier_hz=self.carrier_hz,
            channels=self.channels,
            swap_iq=self.swap_iq,
            mains_hz=self.mains_hz,
            speed_bands_mps=self.speed_bands_mps,
            min_speed_mps=self.min_speed_mps,
            max_speed_mps=self.max_speed_mps,
            highpass_hz=self.highpass_hz,
            approaching_name=self.directions.approaching,
            receding_name=self.directions.receding,
            mounting=valid[-1] if valid else mountings[0],
        )


class Settings(BaseSettings):
    """All settings, frozen."""

    model_config = SettingsConfigDict(
        extra="forbid", frozen=True, env_prefix="GINNEL_", env_nested_delimiter="__"
    )

    site: SiteSettings = SiteSettings()
    store: StoreSettings = StoreSettings()
    web: WebSettings = WebSettings()
    sensor: Annotated[tuple[SensorSettings, ...], _Listed] = ()

    @field_validator("sensor")
    @classmethod
    def _distinct(cls, sensors: tuple[SensorSettings, ...]) -> tuple[SensorSettings, ...]:
        names = [sensor.name for sensor in sensors]
        doubled = sorted({name for name in names if names.count(name) > 1})
        if doubled:
            raise ValueError(f"two sensors are called {doubled[0]}")
        return sensors

    @classmethod
    def settings_customise_sources(
        cls,
        settings_cls: type[BaseSettings],
        init_settings: PydanticBaseSettingsSource,
        env_settings: PydanticBaseSettingsSource,
        dotenv_settings: PydanticBaseSettingsSource,
        file_secret_settings: PydanticBaseSettingsSource,
    ) -> tuple[PydanticBaseSettingsSource, ...]:
        """Ask the environment first, then what the file said."""
        return env_settings, init_settings

    def find_sensor(self, name: str | None) -> SensorSettings:
        """Find a sensor by name, or the only one there is.

        Raises
        ------
        ConfigError
            No sensor has that name, or none was named and there is not exactly one.
        """
        known = ", ".join(sensor.name for sensor in self.sensor) or "none"
        if name is None:
            if len(self.sensor) == 1:
                return self.sensor[0]
            raise ConfigError(f"say which sensor with --sensor NAME; configured: {known}")
        for sensor in self.sensor:
            if sensor.name == name:
                return sensor
        raise ConfigError(f"no sensor is called {name}; configured: {known}")


def _mounting(values: Mapping[str, Any]) -> Mounting:
    """One complete mounting as the measuring chain's word."""
    fields = {key: value for key, value in values.items() if key != "since"}
    since: datetime | None = values["since"]
    return Mounting(**fields, since_us=None if since is None else to_us(since))


def find_file(given: Path | None, environ: Mapping[str, str]) -> Path | None:
    """Where the settings are: ``--config``, else ./ginnel.toml, else ``GINNEL_CONFIG``, else nowhere."""
    if given is not None:
        return given
    if DEFAULT_FILE.is_file():
        return DEFAULT_FILE
    return Path(environ["GINNEL_CONFIG"]) if environ.get("GINNEL_CONFIG") else None


def load_settings(given: Path | None = None) -> Settings:
    """Read the settings from the file and the environment.

    Raises
    ------
    ConfigError
        There is no file, or it cannot be read, or a key is unknown or out of range (one line each).
    """
    path = find_file(given, os.environ)
    if path is None:
        if any(key.startswith("GINNEL_SENSOR") for key in os.environ):
            return _validated({}, None, "")
        raise ConfigError("no ginnel.toml here: run `ginnel init`, or say where it is with --config FILE")
    try:
        text = path.read_text("utf-8")
        raw = tomllib.loads(text)
    except UnicodeDecodeError as exc:
        raise ConfigError(f"{path}: not UTF-8 text: {exc.reason} at byte {exc.start}") from exc
    except FileNotFoundError as exc:
        raise ConfigError(f"{path}: is not there: make one with `ginnel init`, or name another") from exc
    except OSError as exc:
        raise ConfigError(f"{path}: cannot be read: {exc.strerror}") from exc
    except tomllib.TOMLDecodeError as exc:
        raise ConfigError(f"{path}: not valid TOML: {exc}") from exc
    return _validated(_anchored(raw, path.absolute().parent), path, text)


def _anchored(raw: dict[str, Any], folder: Path) -> dict[str, Any]:
    """Make relative paths absolute, from the file's own folder."""
    store = raw.setdefault("store", {})
    if isinstance(store, dict):
        url = store.setdefault("url", StoreSettings().url)
        if isinstance(url, str) and url.startswith("sqlite:///") and not url.startswith("sqlite:////"):
            file, mark, query = url.removeprefix("sqlite:///").partition("?")
            if file not in ("", ":memory:"):
                store["url"] = f"sqlite:///{folder / file}{mark}{query}"
    sensors = raw.get("sensor", [])
    if isinstance(sensors, list):
        for sensor in (s for s in sensors if isinstance(s, dict)):
            source = sensor.setdefault("source", {})
            if isinstance(source, dict) and source.get("kind", "folder") == "folder":
                path = source.setdefault("path", SourceSettings().path)
                source["path"] = str(folder / path) if isinstance(path, str) else path
        raw["sensor"] = {str(number): sensor for number, sensor in enumerate(sensors)}
    return raw


def _validated(raw: dict[str, Any], path: Path | None, text: str) -> Settings:
    unknown = [
        key
        for key in sorted(os.environ)
        if key.startswith("GINNEL_")
        and "__" in key
        and key.split("__")[0].removeprefix("GINNEL_").lower() not in Settings.model_fields
    ]
    if unknown:
        raise ConfigError(f"environment variable {unknown[0]}: no such setting")
    try:
        return Settings(**raw)
    except ValidationError as exc:
        raise ConfigError("\n".join(describe(exc, path, text, os.environ, Settings))) from exc
    except SettingsError as exc:
        raise ConfigError(f"environment: {exc}") from exc


def default_config_text(site: str = "My site", timezone: str = "UTC") -> str:
    """Give the commented ``ginnel.toml`` that ``ginnel init`` writes."""
    template = resources.files("ginnel").joinpath("default.toml").read_text("utf-8")
    return template.replace("@SITE@", json.dumps(site)).replace("@TIMEZONE@", json.dumps(timezone))
