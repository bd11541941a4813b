"""What a minute says of each condition, from real signals through the gauge."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from ginnel.daemon.findings import computer_findings, sensor_findings
from ginnel.daemon.health import ComputerHealth, Gauge, computer_health
from ginnel.daemon.usual import Usual, missed_passages
from ginnel.words import US_PER_S, Block, Channels, Sensor

RATE = 4000
NORTH = Sensor(name="north")
MB = 1_000_000


def block(samples: np.ndarray, second: int = 0) -> Block:
    return Block(
        started_us=second * US_PER_S, sample_rate_hz=float(RATE), samples=np.asarray(samples, np.float32)
    )


def noise(rms: float, duration_s: float = 12) -> np.ndarray:
    return np.random.default_rng(3).normal(0, rms, round(duration_s * RATE))


def tone(frequency_hz: float, amplitude: float, duration_s: float = 12) -> np.ndarray:
    return amplitude * np.sin(2 * np.pi * frequency_hz * np.arange(round(duration_s * RATE)) / RATE)


def bad_of(samples: np.ndarray | None, usual: Usual | None = None, sensor: Sensor = NORTH) -> dict[str, str]:
    """Kinds that are bad, with their sentences."""
    gauge = Gauge(sensor)
    if samples is not None:
        gauge.heard(block(samples))
    minute = gauge.take(0, ComputerHealth())
    return {one.kind: one.sentence for one in sensor_findings(minute, usual or Usual()) if one.is_bad}


def test_a_healthy_input_has_nothing() -> None:
    assert bad_of(noise(0.01)) == {}


@pytest.mark.parametrize(
    ("samples", "kind", "sentence"),
    [
        (None, "no-samples", "north: no samples have come for minutes."),
        (np.full(3 * RATE, 0.5), "input-dead", "north: the input is dead: it gives one and the same value."),
        (noise(2**-16 / 2), "input-dead", "north: the input is dead: its level is -99 dBFS."),
        (
            np.clip(noise(1.0), -1, 1),
            "input-clips",
            "north: the input clips: 31.8 % of samples are at full scale.",
        ),
        (
            noise(0.01) + tone(100, 0.02),
            "lamp-line",
            "north: a lamp's line stands 34 dB above the noise and reads as 1.42 m/s, "
            "a speed that is looked for.",
        ),
        (noise(0.01) + tone(150, 0.03), "mains-hum", "north: mains hum stands 38 dB above the noise."),
    ],
)
def test_each_fault_of_an_input_is_told(samples: np.ndarray | None, kind: str, sentence: str) -> None:
    found = bad_of(samples)
    assert set(found) == {kind}
    numbers = re.compile(r"-?\d+(?:\.\d)?(?= dB| %)")  # as measured: a little beside the exact ones
    assert numbers.sub("N", found[kind]) == numbers.sub("N", sentence)
    for told, exact in zip(numbers.findall(found[kind]), numbers.findall(sentence), strict=True):
        assert float(told) == pytest.approx(float(exact), abs=1.5)


def test_a_lamp_at_a_speed_that_is_not_looked_for_does_no_harm() -> None:
    """100 Hz at 24.125 GHz reads 0.62 m/s; here slower than 1 m/s is not followed."""
    fast = replace(NORTH, carrier_hz=24.125e9, min_speed_mps=1.0, max_speed_mps=8.0)
    assert "lamp-line" not in bad_of(noise(0.01) + tone(100, 0.02), sensor=fast)
    assert "lamp-line" in bad_of(noise(0.01) + tone(100, 0.02), sensor=replace(fast, min_speed_mps=0.5))


def test_a_lost_source_is_lost_until_samples_come() -> None:
    gauge = Gauge(NORTH)
    gauge.lost("the socket was closed")
    found = {one.kind: one for one in sensor_findings(gauge.take(0, ComputerHealth()), Usual())}
    assert found["source-lost"].is_bad
    assert found["source-lost"].sentence == "north: the source is lost: the socket was closed."
    assert found["no-samples"].is_bad is False
    gauge.heard(block(noise(0.01)))
    found = {one.kind: one for one in sensor_findings(gauge.take(1, ComputerHealth()), Usual())}
    assert found["source-lost"].is_bad is False


def test_an_empty_folder_of_recordings_is_no_fault() -> None:
    minute = Gauge(NORTH, is_steady=False).take(0, ComputerHealth())
    assert not any(one.is_bad for one in sensor_findings(minute, Usual()))


def test_drops_and_lag_are_of_their_minute() -> None:
    gauge = Gauge(NORTH)
    gauge.dropped(100)
    gauge.dropped(28)
    gauge.lags(1.0)
    gauge.lags(40.0)
    gauge.lags(2.0)
    gauge.heard(block(noise(0.01, 60)))
    first, second = gauge.take(0, ComputerHealth()), gauge.take(1, ComputerHealth())
    assert (first.sample.dropped_samples, first.sample.lag_s, first.sample.listened_s) == (128, 40.0, 60.0)
    assert (second.sample.dropped_samples, second.sample.lag_s, second.sample.listened_s) == (0, None, 0.0)
    bad = {one.kind: one.sentence for one in sensor_findings(first, Usual()) if one.is_bad}
    assert bad == {
        "samples-dropped": "north: 128 samples were dropped within a minute.",
        "lagging": "north: listening is 40 s behind what comes in.",
    }


def test_a_pair_is_gauged_too() -> None:
    gauge = Gauge(replace(NORTH, channels=Channels.IQ))
    pair = (noise(0.01) + 1j * noise(0.01)[::-1]).astype(np.complex64)
    gauge.heard(Block(started_us=0, sample_rate_hz=float(RATE), samples=pair))
    sample = gauge.take(0, ComputerHealth()).sample
    assert sample.level_dbfs == pytest.approx(10 * np.log10(2e-4), abs=0.2)


def test_a_module_that_lost_its_power_is_quieter_than_usual() -> None:
    """Noise of rms 0.001 at 4 kHz is 2e-6 / 2000 Hz, -90 dBFS per Hz."""
    assert "quieter-than-usual" in bad_of(noise(0.001), Usual(noise_dbfs_hz=-75.0))
    assert "quieter-than-usual" not in bad_of(noise(0.001), Usual(noise_dbfs_hz=-88.0))


def test_only_noise_is_heard_where_many_should_have_passed() -> None:
    assert bad_of(noise(0.01), Usual(missed_passages=42.0)) == {
        "only-noise": "north: only noise is heard: nobody has passed where about 42 are usual."
    }
    assert bad_of(noise(0.01), Usual(missed_passages=3.0)) == {}


def test_what_is_missed_is_what_is_usual_at_this_hour_of_the_week() -> None:
    """Four weeks with 20 passages in each of the week's hours 10 to 19, then nobody on the fifth Monday."""
    hour_us = 3600 * US_PER_S
    week = np.zeros(168)
    week[10:20] = 20
    count = np.concatenate([np.tile(week, 4), np.zeros(15)])
    listened_us = np.full(len(count), float(hour_us))
    assert missed_passages(count, listened_us) == pytest.approx(5 * 20)
    assert missed_passages(count[:-5], listened_us[:-5]) == 0  # the night
    listened_us[-2:] = 0
    assert missed_passages(count, listened_us) == pytest.approx(3 * 20)
    assert missed_passages(np.concatenate([count, [1.0]]), np.full(len(count) + 1, hour_us)) == 0


def test_nothing_is_missed_of_a_place_not_known_yet() -> None:
    count = np.concatenate([np.full(168, 9.0), np.zeros(30)])
    assert missed_passages(count, np.full(198, 3.6e9)) == 0
    assert missed_passages(np.zeros(500), np.full(500, 3.6e9)) == 0


def test_the_computers_faults_are_told() -> None:
    def bad(computer: ComputerHealth, **more: object) -> dict[str, str]:
        told = {"clock_is_set": True, "keep_free_bytes": 500 * MB, "store_trouble": None} | more
        findings = computer_findings(computer, **told)  # type: ignore[arg-type] # as each case gives them
        return {one.kind: one.sentence for one in findings if one.is_bad}

    well = ComputerHealth(disk_free_bytes=5000 * MB, temperature_c=50.0)
    assert bad(well) == bad(ComputerHealth()) == {}
    assert bad(replace(well, disk_free_bytes=450 * MB)) == {
        "disk-nearly-full": "The disk is nearly full: 450 MB are free."
    }
    assert bad(replace(well, disk_free_bytes=99 * MB)) == {
        "disk-nearly-full": "The disk is nearly full: 99 MB are free.",
        "disk-full": "The disk is full: 99 MB are free.",
    }
    assert bad(replace(well, temperature_c=81.4)) == {"too-hot": "The computer is at 81 °C."}
    assert bad(well, clock_is_set=False) == {
        "clock-not-set": "The clock has not been set since the computer started."
    }
    assert bad(well, store_trouble="it is away") == {
        "store-unreachable": "The store cannot be written: it is away."
    }


def test_room_must_come_back_with_a_margin() -> None:
    states = [
        next(
            one.is_bad
            for one in computer_findings(
                ComputerHealth(disk_free_bytes=free * MB),
                clock_is_set=True,
                keep_free_bytes=500 * MB,
                store_trouble=None,
            )
            if one.kind == "disk-nearly-full"
        )
        for free in (500, 501, 549, 551)
    ]
    assert states == [True, None, None, False]


def test_the_computer_is_read_from_the_system(tmp_path: Path) -> None:
    for number, millidegrees in enumerate((41_000, 55_500)):
        zone = tmp_path / "sys" / "class" / "thermal" / f"thermal_zone{number}"
        zone.mkdir(parents=True)
        (zone / "temp").write_text(f"{millidegrees}\n")
    here = computer_health(tmp_path, sys_root=tmp_path / "sys")
    assert here.temperature_c == 55.5
    assert here.disk_free_bytes is not None
    assert here.disk_size_bytes is not None
    assert 0 < here.disk_free_bytes <= here.disk_size_bytes
    assert here.resident_bytes is not None
    assert 10 * MB < here.resident_bytes < 10_000 * MB
    nowhere = computer_health(tmp_path / "no", sys_root=tmp_path / "no", proc_root=tmp_path / "no")
    assert nowhere == ComputerHealth()
