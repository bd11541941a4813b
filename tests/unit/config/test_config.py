"""The settings file: what it means, what is refused and how it says so.

Expected values are the contract's own example (design, section 6) and hand calculation.
"""

from __future__ import annotations

import re
from dataclasses import fields
from pathlib import Path

import pytest

from ginnel.config import Settings, SourceKind, default_config_text, load_settings
from ginnel.config.source import KEYS
from ginnel.errors import ConfigError
from ginnel.words import Aspect, Channels, Sensor

CONTRACT = """
[site]
name = "Tannery annex"            # invented
timezone = "Europe/Dublin"
[store]
url = "sqlite:///ginnel.db"       # or postgresql+psycopg://...
[[sensor]]
name = "north-corridor"
carrier_hz = 10.525e9
channels = "mono"
mains_hz = 50
speed_bands_mps = [0.5, 1.0, 1.5, 2.0, 3.0]
min_speed_mps = 0.3
max_speed_mps = 5.0               # 60 for a road
highpass_hz = 8.0                 # of the amplifier, if known
[sensor.mounting]
aspect = "axial"
height_m = 2.4
offset_m = 0.0
beam_angle_deg = 0.0
tilt_deg = 15.0
beam_width_deg = [80.0, 40.0]
since = 2026-03-02T00:00:00Z
[sensor.directions]
approaching = "to the workshops"
receding = "to the street"
[sensor.source]
kind = "folder"
path = "captures"
"""


@pytest.fixture(autouse=True)
def _clean_environment(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.chdir(tmp_path)
    for name in ("GINNEL_CONFIG", "GINNEL_STORE__URL"):
        monkeypatch.delenv(name, raising=False)


def settings_from(text: str, folder: Path) -> Settings:
    file = folder / "ginnel.toml"
    file.write_text(text, "utf-8")
    return load_settings(file)


def test_the_contracts_own_example_is_read_key_by_key(tmp_path: Path) -> None:
    settings = settings_from(CONTRACT, tmp_path)
    assert settings.site.name == "Tannery annex"
    assert settings.site.to_site().timezone == "Europe/Dublin"
    sensor = settings.find_sensor(None).to_sensor()
    assert sensor.name == "north-corridor"
    assert sensor.carrier_hz == 10.525e9
    assert sensor.channels is Channels.MONO
    assert sensor.mains_hz == 50
    assert sensor.speed_bands_mps == (0.5, 1.0, 1.5, 2.0, 3.0)
    assert (sensor.min_speed_mps, sensor.max_speed_mps, sensor.highpass_hz) == (0.3, 5.0, 8.0)
    assert (sensor.approaching_name, sensor.receding_name) == ("to the workshops", "to the street")
    assert sensor.mounting.aspect is Aspect.AXIAL
    assert sensor.mounting.tilt_deg == 15.0
    assert sensor.mounting.beam_width_deg == (80.0, 40.0)
    # `date -u -d 2026-03-02 +%s` of GNU coreutils says 1772409600
    assert sensor.mounting.since_us == 1_772_409_600_000_000


def test_relative_paths_start_at_the_files_own_folder(tmp_path: Path) -> None:
    settings = settings_from(CONTRACT, tmp_path)
    assert settings.store.url == f"sqlite:///{tmp_path}/ginnel.db"
    assert settings.sensor[0].source.path == f"{tmp_path}/captures"


@pytest.mark.parametrize("url", ["sqlite:////var/lib/ginnel.db", "sqlite://", "postgresql+psycopg://u@h/d"])
def test_absolute_urls_stay_as_they_are(tmp_path: Path, url: str) -> None:
    assert settings_from(f'[store]\nurl = "{url}"\n', tmp_path).store.url == url


def test_the_generated_file_gives_the_defaults(tmp_path: Path) -> None:
    settings = settings_from(default_config_text("Ropewalk", "Europe/Dublin"), tmp_path)
    assert settings.site.name == "Ropewalk"
    made = settings.sensor[0].to_sensor()
    default = Sensor(name="sensor-1")
    for field in fields(Sensor):
        if not field.name.endswith("_name"):
            assert getattr(made, field.name) == getattr(default, field.name)


@pytest.mark.parametrize("kind", list(SourceKind))
def test_the_commented_keys_of_the_generated_file_can_all_be_uncommented(
    tmp_path: Path, kind: SourceKind
) -> None:
    text = default_config_text()
    head, _, body = text.partition("[site]")
    body, mark, source = body.partition("[sensor.source]")
    uncommented = "\n".join(
        line[2:] if line.startswith("# ") and not line.startswith("# swap_iq") else line
        for line in body.splitlines()
    )
    lines = dict(re.findall(r"^(?:# )?([a-z_]+)( = \S.*)$", source, re.MULTILINE))
    lines |= {"kind": f' = "{kind.value}"', "after": ' = "archive"'}
    keys = [key + value for key, value in lines.items() if key in {"kind", *KEYS[kind]}]
    assert len(keys) == 1 + len(KEYS[kind])
    settings = settings_from("\n".join([head + "[site]" + uncommented, mark, *keys]), tmp_path)
    assert settings.sensor[0].mounting_change[0].height_m == 2.6
    assert settings.sensor[0].source.kind is kind


@pytest.mark.parametrize(
    ("source", "message"),
    [
        ('kind = "tcp"\nhost = "10.0.0.2"\nport = 7000', r'line 27: .*kind = "tcp" needs rate_hz'),
        ('kind = "pipe"\nrate_hz = 8000', r'kind = "pipe" needs path'),
        ('kind = "sound"\nrate_hz = 8000\nport = 1', r'port does not go with kind = "sound"'),
        ('kind = "pipe"\npath = "-"\nrate_hz = "8 kHz"', r"line 30: .*rate_hz: must be a valid number"),
        ('kind = "pipe"\npath = "-"\nrate_hz = 8', r"rate_hz: must be greater than or equal to 1000"),
        ('kind = "folder"\nafter = "archive"', r'after = "archive" and archive \(a folder\) go together'),
        ('kind = "folder"\nafter = "burn"', r"after: must be 'keep', 'archive' or 'delete'"),
        ('kind = "pipe"\npath = "-"\nrate_hz = 8000\nsample_type = "pcm"', r"sample_type: must be r or c"),
        ('kind = "pipe"\npath = "-"\nrate_hz = 8000\nsample_type = "ci8"', r"it must begin with r"),
    ],
)
def test_a_source_is_given_what_its_kind_needs_and_nothing_else(
    tmp_path: Path, source: str, message: str
) -> None:
    text = CONTRACT.replace('kind = "folder"\npath = "captures"', source)
    with pytest.raises(ConfigError, match=message):
        settings_from(text, tmp_path)


def test_paths_of_the_source_and_of_listening_start_at_the_file(tmp_path: Path) -> None:
    source = 'kind = "folder"\npath = "in"\nafter = "archive"\narchive = "heard"'
    settings = settings_from(CONTRACT.replace('kind = "folder"\npath = "captures"', source), tmp_path)
    assert settings.sensor[0].source.path == str(tmp_path / "in")
    assert settings.sensor[0].source.archive == str(tmp_path / "heard")
    assert settings.listen.state == str(tmp_path / "listening")
    source = 'kind = "pipe"\npath = "-"\nrate_hz = 8000'
    settings = settings_from(CONTRACT.replace('kind = "folder"\npath = "captures"', source), tmp_path)
    assert settings.sensor[0].source.path == "-"


@pytest.mark.parametrize(
    ("old", "new", "line", "message"),
    [
        ("carrier_hz = 10.525e9", "carrier_hz = 24.125", 9, r"sensor\[0\]\.carrier_hz: must be greater"),
        ("carrier_hz = 10.525e9", "carrier_hz = 400e9", 9, r"sensor\[0\]\.carrier_hz: must be less"),
        ("carrier_hz =", "carier_hz =", 9, r"sensor\[0\]\.carier_hz: unknown key; did you mean carrier_hz\?"),
        ("min_speed_mps = 0.3", "min_speed_mps = 7", 7, r"min_speed_mps \(7\) must be below max_speed_mps"),
        ("[0.5, 1.0, 1.5, 2.0, 3.0]", "[0.5, 0.4]", 12, r"speed_bands_mps: edges must ascend"),
        ("tilt_deg = 15.0", "tilt_deg = 91", 21, r"mounting\.tilt_deg: must be less than or equal to 90"),
        ("beam_angle_deg = 0.0", "beam_angle_deg = -1", 20, r"beam_angle_deg: must be greater"),
        ("[80.0, 40.0]", "[80.0]", 22, r"beam_width_deg"),
        ('"Europe/Dublin"', '"Europe/Atlantis"', 4, r"site\.timezone: not an IANA time zone"),
        ('"Europe/Dublin"', '"../etc"', 4, r"site\.timezone: not an IANA time zone"),
        ('channels = "mono"', 'channels = "stereo"', 10, r"channels: must be 'mono' or 'iq'"),
        ('channels = "mono"', "swap_iq = true", 7, r'swap_iq needs channels = "iq"'),
        ("2026-03-02T00:00:00Z", "2026-03-02T00:00:00", 23, r"since: .*timezone"),
        ('"north-corridor"', '"north corridor"', 8, r"sensor\[0\]\.name: must be letters, digits"),
        ('kind = "folder"', 'kind = "carrier-pigeon"', 28, r"source\.kind: must be 'folder'"),
        ('"to the street"', '"to the workshops"', 24, r"two different names"),
        ("[sensor.source]", "[sensor.sauce]", 27, r"sensor\[0\]\.sauce: unknown key; did you mean source"),
        ("mains_hz = 50", "mains_hz = 'fifty'", 11, r"mains_hz: must be a valid number.*\(it is 'fifty'\)"),
        ("sqlite:///ginnel.db", "mysql://x", 6, r"store\.url: must be sqlite:///FILE or postgresql"),
        ("[sensor.source]", "[sensor.source]\nmains_hz = 50", 28, r"mains_hz: unknown key$"),
    ],
)
def test_a_bad_setting_is_one_line_with_file_line_and_key(
    tmp_path: Path, old: str, new: str, line: int, message: str
) -> None:
    assert old in CONTRACT
    with pytest.raises(ConfigError, match=message) as caught:
        settings_from(CONTRACT.replace(old, new, 1), tmp_path)
    assert "\n" not in str(caught.value)
    assert f"ginnel.toml, line {line}: " in str(caught.value)


def test_two_bad_settings_are_two_lines(tmp_path: Path) -> None:
    text = CONTRACT.replace("tilt_deg = 15.0", "tilt_deg = 91").replace("height_m = 2.4", "height_m = -1")
    with pytest.raises(ConfigError) as caught:
        settings_from(text, tmp_path)
    assert [line.split(": ")[1] for line in str(caught.value).splitlines()] == [
        "sensor[0].mounting.height_m",
        "sensor[0].mounting.tilt_deg",
    ]


def test_a_syntax_error_names_file_and_line(tmp_path: Path) -> None:
    with pytest.raises(ConfigError, match=r"ginnel\.toml: not valid TOML: .*line 3"):
        settings_from('[site]\nname = "a"\nname =\n', tmp_path)


def test_a_file_that_is_not_text_or_not_there_is_refused(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(ConfigError, match="not UTF-8"):
        load_settings(tmp_path / "ginnel.toml")
    with pytest.raises(ConfigError, match=r"none\.toml: is not there: make one with `ginnel init`"):
        load_settings(tmp_path / "none.toml")


def test_no_file_anywhere_says_how_to_get_one() -> None:
    with pytest.raises(ConfigError, match="ginnel init"):
        load_settings()


def test_the_file_is_looked_for_here_and_then_where_the_environment_says(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    elsewhere = tmp_path / "elsewhere.toml"
    elsewhere.write_text('[site]\nname = "elsewhere"\n', "utf-8")
    monkeypatch.setenv("GINNEL_CONFIG", str(elsewhere))
    assert load_settings().site.name == "elsewhere"
    (tmp_path / "ginnel.toml").write_text('[site]\nname = "here"\n', "utf-8")
    assert load_settings().site.name == "here"
    assert load_settings(elsewhere).site.name == "elsewhere"


def test_the_environment_wins_over_the_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GINNEL_SITE__NAME", "Malthouse")
    monkeypatch.setenv("GINNEL_STORE__URL", "sqlite:////tmp/other.db")
    monkeypatch.setenv("GINNEL_SENSOR__0__CARRIER_HZ", "24.125e9")
    monkeypatch.setenv("GINNEL_SENSOR__0__SPEED_BANDS_MPS", "[1, 2]")
    monkeypatch.setenv("GINNEL_SENSOR__0__MOUNTING__HEIGHT_M", "3.1")
    settings = settings_from(CONTRACT, tmp_path)
    assert settings.site.name == "Malthouse"
    assert settings.site.timezone == "Europe/Dublin"
    assert settings.store.url == "sqlite:////tmp/other.db"
    sensor = settings.sensor[0].to_sensor()
    assert (sensor.name, sensor.carrier_hz) == ("north-corridor", 24.125e9)
    assert sensor.speed_bands_mps == (1.0, 2.0)
    assert (sensor.mounting.height_m, sensor.mounting.tilt_deg) == (3.1, 15.0)


def test_the_environment_alone_is_enough(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GINNEL_SENSOR", '[{"name": "gate", "channels": "iq"}]')
    assert load_settings().find_sensor("gate").channels is Channels.IQ


def test_a_bad_environment_variable_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GINNEL_SENSOR__0__MAINS_HZ", "1")
    with pytest.raises(ConfigError, match=r"environment variable GINNEL_SENSOR__0__MAINS_HZ: sensor\[0\]"):
        settings_from(CONTRACT, tmp_path)


@pytest.mark.parametrize("name", ["GINNEL_SIGHT__NAME", "GINNEL_SITE__NAMES"])
def test_an_unknown_environment_variable_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str
) -> None:
    monkeypatch.setenv(name, "x")
    with pytest.raises(ConfigError, match=f"environment variable {name}"):
        settings_from(CONTRACT, tmp_path)


CHANGES = """
[[sensor.mounting_change]]
since = 2026-04-01T00:00:00+02:00
height_m = 2.9
[[sensor.mounting_change]]
since = 2026-05-01T00:00:00Z
tilt_deg = 5
"""


def test_a_mounting_change_takes_over_from_its_own_date_and_keeps_the_rest(tmp_path: Path) -> None:
    config = settings_from(CONTRACT + CHANGES, tmp_path).sensor[0]
    april_us = 1_774_994_400_000_000  # 2026-03-31T22:00:00Z, GNU date
    assert config.to_sensor(april_us - 1).mounting.height_m == 2.4
    april = config.to_sensor(april_us).mounting
    assert (april.height_m, april.tilt_deg, april.since_us) == (2.9, 15.0, april_us)
    newest = config.to_sensor().mounting
    assert (newest.height_m, newest.tilt_deg, newest.beam_width_deg) == (2.9, 5.0, (80.0, 40.0))
    assert config.to_sensor(0).mounting.height_m == 2.4, "before the first date: the first mounting"


def test_mounting_changes_out_of_order_are_refused(tmp_path: Path) -> None:
    with pytest.raises(ConfigError, match="order of their dates"):
        settings_from(CONTRACT + CHANGES.replace("2026-05", "2025-05"), tmp_path)
    with pytest.raises(ConfigError, match=r"later than mounting\.since"):
        settings_from(CONTRACT + CHANGES.replace("2026-04", "2026-01"), tmp_path)


def test_sensors_have_different_names(tmp_path: Path) -> None:
    with pytest.raises(ConfigError, match="two sensors are called a"):
        settings_from('[[sensor]]\nname = "a"\n[[sensor]]\nname = "a"\n', tmp_path)


def test_a_sensor_must_be_named_where_there_are_several(tmp_path: Path) -> None:
    settings = settings_from('[[sensor]]\nname = "a"\n[[sensor]]\nname = "b"\n', tmp_path)
    with pytest.raises(ConfigError, match="--sensor NAME; configured: a, b"):
        settings.find_sensor(None)
    with pytest.raises(ConfigError, match="no sensor is called c; configured: a, b"):
        settings.find_sensor("c")
    assert settings.find_sensor("b").name == "b"


def test_settings_are_frozen(tmp_path: Path) -> None:
    settings = settings_from(CONTRACT, tmp_path)
    with pytest.raises(ValueError, match="frozen"):
        settings.site.name = "other"
