"""The invented place: its settings, written where the demo lives."""

from __future__ import annotations

from pathlib import Path

from ginnel.config import Settings, load_settings
from ginnel.errors import ConfigError
from ginnel.store import open_store, put_site

SETTINGS_TEXT = """\
# The demo's settings: an invented place. `ginnel serve` in this folder shows its log again.
[site]
name = "Tannery annex (invented)"
timezone = "Europe/Dublin"

[store]
url = "sqlite:///ginnel.db"

[web]
locale = "en-IE"
speed_limit = 2.0

[[sensor]]
name = "north-corridor"
carrier_hz = 10.525e9
channels = "mono"
highpass_hz = 8.0
[sensor.mounting]
height_m = 2.4
tilt_deg = 15.0
[sensor.directions]
approaching = "to the workshops"
receding = "to the street"
[sensor.source]
path = "captures/north-corridor"

[[sensor]]
name = "yard-gate"
carrier_hz = 24.125e9
channels = "iq"
[sensor.mounting]
height_m = 2.2
offset_m = 0.4
tilt_deg = 10.0
[sensor.directions]
approaching = "in from the yard"
receding = "out to the yard"
[sensor.source]
path = "captures/yard-gate"

[[space]]
name = "workshops"
empty_at = "04:00"
[[space.door]]
sensor = "north-corridor"
entering = "approaching"
[[space.door]]
sensor = "yard-gate"
entering = "approaching"
"""


def prepare(folder: Path) -> Settings:
    """Write the demo's settings into a folder, which may hold them already, and make its store.

    Raises
    ------
    ConfigError
        The folder holds other settings, or cannot be written.
    """
    file = folder / "ginnel.toml"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        if file.exists() and file.read_text("utf-8") != SETTINGS_TEXT:
            raise ConfigError(f"{file} is not the demo's: give the demo a folder of its own")
        file.write_text(SETTINGS_TEXT, "utf-8")
    except OSError as exc:
        raise ConfigError(f"{file} cannot be written: {exc.strerror}") from exc
    settings = load_settings(file)
    with open_store(settings.store.url, create=True) as store:
        put_site(store, settings.site.to_site())
    return settings
