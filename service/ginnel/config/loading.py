"""Reading the settings: which file, what its paths mean, what is wrong with it."""

from __future__ import annotations

import json
import os
import tomllib
from collections.abc import Mapping
from importlib import resources
from pathlib import Path
from typing import Any

from pydantic import ValidationError
from pydantic_settings import SettingsError

from ginnel.config.faults import describe
from ginnel.config.sections import ListenSettings, StoreSettings
from ginnel.config.source import SourceSettings
from ginnel.config.tree import Settings
from ginnel.config.upkeep import BackupSettings
from ginnel.errors import ConfigError

DEFAULT_FILE = Path("ginnel.toml")


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
    listen = raw.setdefault("listen", {})
    if isinstance(listen, dict):
        _anchor(listen, "state", folder, ListenSettings().state)
    backup = raw.setdefault("backup", {})
    if isinstance(backup, dict):
        _anchor(backup, "folder", folder, BackupSettings().folder)
    sensors = raw.get("sensor", [])
    if isinstance(sensors, list):
        for sensor in (s for s in sensors if isinstance(s, dict)):
            source = sensor.setdefault("source", {})
            if isinstance(source, dict):
                is_folder = source.get("kind", "folder") == "folder"
                _anchor(source, "path", folder, SourceSettings().path if is_folder else None)
                _anchor(source, "archive", folder, None)
        raw["sensor"] = {str(number): sensor for number, sensor in enumerate(sensors)}
    spaces = raw.get("space", [])
    if isinstance(spaces, list):
        raw["space"] = {str(number): space for number, space in enumerate(spaces)}
    return raw


def _anchor(table: dict[str, Any], key: str, folder: Path, default: str | None) -> None:
    """Make one path absolute; ``-`` (standard input) stays as it is."""
    path = table.get(key, default)
    if isinstance(path, str) and path not in ("", "-"):
        table[key] = str(folder / path)


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
