"""All settings as one frozen tree."""

from __future__ import annotations

from typing import Annotated

from pydantic import field_validator, model_validator
from pydantic_settings import BaseSettings, PydanticBaseSettingsSource, SettingsConfigDict

from ginnel.config.section import Listed
from ginnel.config.sections import ListenSettings, SiteSettings, StoreSettings, WebSettings
from ginnel.config.sensor import SensorSettings
from ginnel.config.space import SpaceSettings
from ginnel.config.upkeep import BackupSettings, NotifySettings, RetentionSettings
from ginnel.errors import ConfigError


class Settings(BaseSettings):
    """All settings, frozen."""

    model_config = SettingsConfigDict(
        extra="forbid", frozen=True, env_prefix="GINNEL_", env_nested_delimiter="__"
    )

    site: SiteSettings = SiteSettings()
    store: StoreSettings = StoreSettings()
    listen: ListenSettings = ListenSettings()
    retention: RetentionSettings = RetentionSettings()
    backup: BackupSettings = BackupSettings()
    notify: NotifySettings = NotifySettings()
    web: WebSettings = WebSettings()
    sensor: Annotated[tuple[SensorSettings, ...], Listed] = ()
    space: Annotated[tuple[SpaceSettings, ...], Listed] = ()

    @field_validator("sensor")
    @classmethod
    def _distinct(cls, sensors: tuple[SensorSettings, ...]) -> tuple[SensorSettings, ...]:
        names = [sensor.name for sensor in sensors]
        doubled = sorted({name for name in names if names.count(name) > 1})
        if doubled:
            raise ValueError(f"two sensors are called {doubled[0]}")
        return sensors

    @model_validator(mode="after")
    def _doors_have_sensors(self) -> Settings:
        names = [space.name for space in self.space]
        doubled = sorted({name for name in names if names.count(name) > 1})
        if doubled:
            raise ValueError(f"two spaces are called {doubled[0]}")
        known = {sensor.name for sensor in self.sensor}
        for space in self.space:
            for door in space.door:
                if door.sensor not in known:
                    raise ValueError(f"space {space.name}: no sensor is called {door.sensor}")
        return self

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
