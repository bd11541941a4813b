"""A virtual ALSA device, through PortAudio: ALSA's own file plug-in, which plays a file.

It needs Debian's libportaudio2; where that is missing the tests are skipped with the reason, and fail
where CI is set.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.unit.capture.ear import Ear, assert_heard_as_replayed, wait_until
from tests.unit.capture.simulated import RATE_HZ, SENSOR, SENSOR_IQ, pcm

from ginnel.capture.links import Chunk
from ginnel.capture.sound import SoundLink
from ginnel.errors import CaptureError, SourceLostError
from ginnel.words import Sensor

DEVICE = """
pcm.ginnel_virtual {{
  type file
  slave.pcm "null"
  file "/dev/null"
  infile "{played}"
  format "raw"
  hint {{ show on description "virtual" }}
}}
"""


class PlayedOnce:
    """The link, for as long as the capture lasts; the clock goes on as samples come.

    The plug-in has no clock of its own, and repeats itself when its file is over.
    """

    def __init__(self, link: SoundLink, n_bytes: int) -> None:
        self.open, self.close = link.open, link.close
        self._link, self._left = link, n_bytes
        self.pass_bytes: Callable[[int], None] = lambda n: None

    def read(self, timeout_s: float) -> Chunk:
        if not self._left:
            return Chunk(is_end=True)
        chunk = self._link.read(timeout_s)
        data = chunk.data[: self._left]
        self._left -= len(data)
        self.pass_bytes(len(data))
        return Chunk(data, chunk.is_overrun)


@pytest.fixture
def virtual_card(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The file that the device plays; the device is there as long as the test runs."""
    try:
        SoundLink(None, SENSOR, RATE_HZ)
    except CaptureError as exc:
        if os.environ.get("CI"):
            pytest.fail(str(exc))
        pytest.skip(str(exc))
    played, config = tmp_path / "played", tmp_path / "asound.conf"
    config.write_text(DEVICE.format(played=played), "utf-8")
    monkeypatch.setenv("ALSA_CONFIG_PATH", f"/usr/share/alsa/alsa.conf:{config}")
    return played


@pytest.mark.parametrize("sensor", [SENSOR, SENSOR_IQ], ids=["mono", "iq"])
def test_what_a_sound_card_plays_gives_the_passages_of_a_replay(virtual_card: Path, sensor: Sensor) -> None:
    data = pcm(sensor)
    virtual_card.write_bytes(data)
    link = PlayedOnce(SoundLink("ginnel_virtual", sensor, RATE_HZ), len(data))
    ear = Ear(link, sensor)
    link.pass_bytes = lambda n: ear.clock.pass_s(n / ear.frame_bytes / RATE_HZ)
    with ear:
        wait_until(lambda: bool(ear.reasons()))
    assert ear.reasons() == ["the input has ended"]
    assert_heard_as_replayed(ear, data, sensor)


def test_a_card_that_is_not_there_is_told_by_name(virtual_card: Path) -> None:
    with pytest.raises(SourceLostError, match=r"sound input no-such-card: No input device"):
        SoundLink("no-such-card", SENSOR, RATE_HZ).open()


def test_without_portaudio_one_line_says_what_to_install(monkeypatch: pytest.MonkeyPatch) -> None:
    import builtins

    real = builtins.__import__

    def missing(name: str, *rest: object) -> object:
        if name == "sounddevice":
            raise OSError("PortAudio library not found")  # as sounddevice says it
        return real(name, *rest)  # type: ignore[arg-type]

    monkeypatch.setattr(builtins, "__import__", missing)
    with pytest.raises(CaptureError, match="sudo apt install libportaudio2"):
        SoundLink(None, SENSOR, RATE_HZ)
