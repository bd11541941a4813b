"""The settings: ``ginnel.toml`` and ``GINNEL_*``, read once into a frozen tree.

The names are a contract with whoever wrote the file. A key that is not known and a value out of
range are errors, one line each, with the file, the line and the key. An environment variable wins over
the file: ``GINNEL_STORE__URL``, ``GINNEL_SENSOR__0__CARRIER_HZ`` (sensors count from 0), a list as JSON.
Relative paths in the file are meant from the file's own folder.
"""

from ginnel.config.loading import DEFAULT_FILE, default_config_text, find_file, load_settings
from ginnel.config.sections import ListenSettings, SiteSettings, StoreSettings, WebSettings
from ginnel.config.sensor import DirectionSettings, MountingChange, MountingSettings, SensorSettings
from ginnel.config.source import SourceKind, SourceSettings
from ginnel.config.space import DoorSettings, SpaceSettings
from ginnel.config.station import StationSettings
from ginnel.config.tree import Settings
from ginnel.config.upkeep import BackupSettings, NotifySettings, RetentionSettings

__all__ = [
    "DEFAULT_FILE",
    "BackupSettings",
    "DirectionSettings",
    "DoorSettings",
    "ListenSettings",
    "MountingChange",
    "MountingSettings",
    "NotifySettings",
    "RetentionSettings",
    "SensorSettings",
    "Settings",
    "SiteSettings",
    "SourceKind",
    "SourceSettings",
    "SpaceSettings",
    "StationSettings",
    "StoreSettings",
    "WebSettings",
    "default_config_text",
    "find_file",
    "load_settings",
]
