"""Scenes as captures on disk: WAV or SigMF, with the truth beside them as CSV and JSON."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np

from ginnel.sim.movers import TrueMover
from ginnel.sim.scene import Scene
from ginnel.times import from_us, utc_text
from ginnel.words import US_PER_S, Channels, SampleArray, Sensor

#: Told after each block: seconds of the scene written since the last call.
OnProgress = Callable[[float], None]

_PLAIN_WAV_BYTES = 0xFFFF_0000

TRUTH_COLUMNS = (
    "started_at",
    "crossed_at",
    "ended_at",
    "direction",
    "mean_speed_mps",
    "story",
    "kind",
    "power_db",
    "cut",
    "name",
)


def capture_name(sensor_name: str, started_us: int) -> str:
    """File name, without suffix, that tells the start time: ``north-20260302T081500Z``."""
    if started_us % US_PER_S:
        raise ValueError("a capture that carries its time in its name must start at a whole second")
    return f"{sensor_name}-{from_us(started_us):%Y%m%dT%H%M%SZ}"


def _columns(samples: SampleArray, sensor: Sensor) -> SampleArray:
    """Channels as wired: shape (n,) mono, (n, 2) I/Q, crossed where the sensor is."""
    if sensor.channels is Channels.MONO:
        return samples
    pair = (samples.imag, samples.real) if sensor.swap_iq else (samples.real, samples.imag)
    return np.column_stack(pair)


def _told_blocks(scene: Scene, on_progress: OnProgress | None) -> Iterator[SampleArray]:
    for block in scene.blocks():
        yield block
        if on_progress is not None:
            on_progress(len(block) / scene.sample_rate_hz)


def write_wav(scene: Scene, path: Path, *, on_progress: OnProgress | None = None) -> Path:
    """Write a 16-bit WAV file; its name should carry the start time (see `capture_name`)."""
    import soundfile

    channels = 2 if scene.sensor.channels is Channels.IQ else 1
    rate_hz = round(scene.sample_rate_hz)
    if rate_hz != scene.sample_rate_hz:
        raise ValueError(f"a WAV file has a whole sample rate, not {scene.sample_rate_hz=}")
    # Sizes in a plain WAV file are 32 bits wide; RF64 is the same with 64 (EBU Tech 3306).
    container = "RF64" if 2 * channels * scene.n_samples > _PLAIN_WAV_BYTES else "WAV"
    try:
        with soundfile.SoundFile(path, "w", rate_hz, channels, subtype="PCM_16", format=container) as file:
            for block in _told_blocks(scene, on_progress):
                file.write(_columns(block, scene.sensor))
    except BaseException as exc:
        path.unlink(missing_ok=True)  # half a capture is none, Ctrl-C or not
        if isinstance(exc, soundfile.LibsndfileError):
            raise OSError(f"{exc.error_string.rstrip('.')}; is the disk full?") from exc
        raise
    return path


def write_sigmf(scene: Scene, path: Path, started_us: int, *, on_progress: OnProgress | None = None) -> Path:
    """Write ``path`` with suffixes .sigmf-data and .sigmf-meta (ri16_le or ci16_le); returns the latter."""
    import sigmf

    is_iq = scene.sensor.channels is Channels.IQ
    data = path.with_name(path.name + ".sigmf-data")
    with data.open("wb") as file:
        for block in _told_blocks(scene, on_progress):
            whole = np.clip(np.rint(_columns(block, scene.sensor) * 32768.0), -32768, 32767)
            file.write(whole.astype("<i2").tobytes())
    described = sigmf.SigMFFile(
        data_file=str(data),
        global_info={
            "core:datatype": "ci16_le" if is_iq else "ri16_le",
            "core:sample_rate": float(scene.sample_rate_hz),
            "core:recorder": "ginnel simulate",
            "core:description": f"simulated, sensor {scene.sensor.name}",
        },
    )
    described.add_capture(0, metadata={"core:datetime": utc_text(started_us)})
    meta = path.with_name(path.name + ".sigmf-meta")
    described.tofile(str(meta), overwrite=True)
    return meta


def truth_row(true: TrueMover, started_us: int) -> dict[str, str | float | bool | None]:
    """One line of a truth file."""

    def at(time_s: float | None) -> str | None:
        return None if time_s is None else utc_text(started_us + round(time_s * US_PER_S))

    return {
        "started_at": at(true.started_s),
        "crossed_at": at(true.crossed_s),
        "ended_at": at(true.ended_s),
        "direction": true.direction.value,
        "mean_speed_mps": round(true.mean_speed_mps, 4),
        "story": true.story.value,
        "kind": true.kind.value,
        "power_db": round(true.power_db, 2),
        "cut": true.cut,
        "name": true.name,
    }


def write_truth(scene: Scene, path: Path, started_us: int) -> Path:
    """Write the truth as CSV or JSON, by the suffix of the path."""
    rows = [truth_row(true, started_us) for true in scene.truth()]
    if path.suffix == ".json":
        told = {"sensor": scene.sensor.name, "started_at": utc_text(started_us), "movers": rows}
        path.write_text(json.dumps(told, indent=2) + "\n", encoding="utf-8")
        return path
    with path.open("w", newline="", encoding="utf-8") as file:
        writer = csv.DictWriter(file, TRUTH_COLUMNS)
        writer.writeheader()
        writer.writerows({**row, "cut": "yes" if row["cut"] else "no"} for row in rows)
    return path
