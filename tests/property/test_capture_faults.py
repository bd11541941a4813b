"""Whatever is done to a capture, it is read or refused in one line: nothing else comes out of it."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import sigmf
import soundfile
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.capture import open_recording
from ginnel.errors import CaptureError
from ginnel.words import Channels, Sensor

SENSORS = (Sensor(name="north"), Sensor(name="north", channels=Channels.IQ))
WAVE = np.random.default_rng(2).uniform(-1, 1, size=600)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("faults")
    soundfile.write(folder / "pcm.wav", WAVE, 8000)
    soundfile.write(folder / "float.wav", WAVE, 8000, subtype="FLOAT")
    soundfile.write(folder / "rf64.wav", WAVE, 8000, format="RF64")
    soundfile.write(folder / "x.flac", WAVE, 8000)
    (WAVE * 32767).astype("<i2").tofile(folder / "x.sigmf-data")
    described = sigmf.SigMFFile(
        data_file=str(folder / "x.sigmf-data"),
        global_info={"core:datatype": "ri16_le", "core:sample_rate": 8000},
    )
    described.add_capture(0, metadata={"core:datetime": "2026-03-02T08:15:00Z"})
    described.add_capture(300, metadata={"core:global_index": 500})
    described.add_annotation(100, 50, metadata={"core:label": "walker"})
    described.tofile(str(folder / "x.sigmf-meta"))
    return folder


def read_or_refuse(path: Path, sensor: Sensor) -> None:
    try:
        for item in open_recording(path, sensor).iter_blocks(256):
            assert item.started_us >= 0
    except CaptureError as exc:
        told = str(exc)
    else:
        return
    assert "\n" not in told
    assert path.stem in told


@settings(max_examples=100, deadline=None)
@given(
    name=st.sampled_from(["pcm.wav", "float.wav", "rf64.wav", "x.flac"]),
    changes=st.lists(
        st.tuples(st.integers(0, 120), st.sampled_from([0, 1, 2, 0x7F, 0x80, 0xFF]) | st.integers(0, 255)),
        min_size=1,
        max_size=6,
    ),
    keep=st.none() | st.integers(0, 1300),
    sensor=st.sampled_from(SENSORS),
)
def test_damaged_sound_files_are_read_or_refused_in_one_line(
    folder: Path, name: str, changes: list[tuple[int, int]], keep: int | None, sensor: Sensor
) -> None:
    whole = bytearray((folder / name).read_bytes())
    for at, value in changes:
        whole[at] = value
    path = folder / f"20260302T081500Z-damaged{Path(name).suffix}"
    path.write_bytes(bytes(whole[:keep]))
    read_or_refuse(path, sensor)


JUNK: st.SearchStrategy[Any] = st.one_of(
    st.none(), st.booleans(), st.integers(-(2**40), 2**70), st.floats(), st.text(max_size=12), st.builds(list)
)


@settings(max_examples=40, deadline=None)
@given(data=st.data(), junk=JUNK, sensor=st.sampled_from(SENSORS))
def test_damaged_sigmf_metadata_is_read_or_refused_in_one_line(
    folder: Path, data: st.DataObject, junk: Any, sensor: Sensor
) -> None:
    told = json.loads((folder / "x.sigmf-meta").read_text(encoding="utf-8"))
    told["global"].pop("core:sha512", None)
    place = data.draw(st.sampled_from([told, told["global"], *told["captures"], *told["annotations"]]))
    key = data.draw(
        st.sampled_from(
            [
                *place,
                "core:num_channels",
                "core:sample_rate",
                "core:datatype",
                "core:dataset",
                "core:datetime",
                "core:global_index",
                "core:sample_count",
            ]
        )
    )
    if data.draw(st.booleans(), label="remove"):
        place.pop(key, None)
    else:
        place[key] = junk
    meta = folder / "20260302T081500Z-damaged.sigmf-meta"
    meta.with_suffix(".sigmf-data").write_bytes((folder / "x.sigmf-data").read_bytes())
    meta.write_text(json.dumps(told), encoding="utf-8")
    read_or_refuse(meta, sensor)
