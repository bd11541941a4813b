"""When live samples were taken; every expected time is arithmetic by hand."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from tests.unit.capture.fed_clock import START_US, FedClock

from ginnel.capture.dating import Dating
from ginnel.capture.live import Break, Dated, Heard
from ginnel.words import US_PER_S, Block

RATE_HZ = 1000.0
RNG = np.random.default_rng(3)


def noise(n: int) -> np.ndarray:
    return RNG.normal(0, 0.01, n).astype(np.float32)


def hear(
    dating: Dating, clock: FedClock, seconds: float, *, rate_hz: float = RATE_HZ, part_s: float = 0.2
) -> list[Heard]:
    """Feed a source that really sends at a rate, in parts, each arriving as soon as it is complete."""
    heard: list[Heard] = []
    sent = 0.0
    for _ in range(round(seconds / part_s)):
        clock.pass_s(part_s)
        sent += rate_hz * part_s
        heard += dating.push(noise(int(sent)), clock.read())
        sent -= int(sent)
    return heard


def blocks(heard: list[Heard]) -> list[Block]:
    return [one for one in heard if isinstance(one, Block)]


def breaks(heard: list[Heard]) -> list[str]:
    return [one.reason for one in heard if isinstance(one, Break)]


def assert_unbroken(heard: list[Block]) -> None:
    """Each block begins where the one before ended, to the microsecond of rounding."""
    index = 0
    for block in heard:
        assert block.started_us == heard[0].started_us + round(index * US_PER_S / RATE_HZ)
        index += len(block.samples)


def test_a_span_is_dated_once_and_advanced_by_its_samples() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    heard = hear(dating, clock, 60.0)
    assert len(heard) == len(blocks(heard))
    assert blocks(heard)[0].started_us == START_US
    assert sum(len(block.samples) for block in blocks(heard)) == 60_000
    assert_unbroken(blocks(heard))
    assert dating.is_trusted
    assert dating.fault is None


def test_samples_that_a_buffer_held_back_do_not_shift_the_date() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    clock.pass_s(2.0)  # two seconds wait in a pipe before anybody reads them, all at once
    heard = dating.push(noise(2000), clock.read())
    heard += hear(dating, clock, 10.0)
    # and later the machine is busy for a while
    clock.pass_s(3.0)
    heard += dating.push(noise(3000), clock.read())
    heard += hear(dating, clock, 10.0)
    assert breaks(heard) == []
    assert blocks(heard)[0].started_us == START_US
    assert_unbroken(blocks(heard))


@given(late_ms=st.lists(st.integers(0, 900), min_size=60, max_size=60))
def test_however_late_parts_arrive_the_date_is_never_early_and_at_most_as_late_as_the_promptest(
    late_ms: list[int],
) -> None:
    dating = Dating(RATE_HZ)
    heard: list[Heard] = []
    arrived_s, prompt_ms = 0.0, []
    for i, late in enumerate(late_ms):
        clock = FedClock()
        arrived_s = max(arrived_s, (i + 1) * 0.2 + late / 1000)  # in order
        clock.pass_s(arrived_s)
        heard += dating.push(noise(200), clock.read())
        prompt_ms.append(arrived_s - (i + 1) * 0.2)
        if blocks(heard):
            break
    assert blocks(heard)[0].started_us == START_US + round(min(prompt_ms) * US_PER_S)


@pytest.mark.parametrize("step_s", [3600.0, -3600.0, 1.0, -1.0])
def test_a_step_of_the_clock_ends_the_span_and_nothing_is_heard_twice(step_s: float) -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    before = hear(dating, clock, 20.0)
    clock.step_s(step_s)
    after = hear(dating, clock, 20.0)
    way = "forward" if step_s > 0 else "back"
    assert breaks(after)[0] == f"the clock was set {way} by {abs(step_s):.1f} s"
    first = blocks(before)
    ended_us = first[-1].started_us + round(len(first[-1].samples) * US_PER_S / RATE_HZ)
    assert ended_us == START_US + 20 * US_PER_S
    second = blocks(after)
    if step_s == -3600.0:
        assert second == []
        assert dating.fault == "the clock is behind what is in the log already"
        # an hour later it goes on by itself
        clock.pass_s(3580.0)
        second = blocks(hear(dating, clock, 30.0))
    assert second[0].started_us >= ended_us
    if step_s > 0:
        assert second[0].started_us == ended_us + round(step_s * US_PER_S)
    if step_s == -1.0:  # a second's samples are dropped: that second is in the log
        assert second[0].started_us == ended_us
        assert sum(len(one.samples) for one in second) == 19_000
    assert_unbroken(second)


def test_a_machine_that_slept_was_not_listening() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    hear(dating, clock, 20.0)
    clock.sleep_s(600.0)
    after = hear(dating, clock, 20.0)
    assert breaks(after) == ["the machine slept"]
    assert blocks(after)[0].started_us == START_US + 620 * US_PER_S


def test_ntp_that_slews_the_clock_does_not_end_the_span() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    heard = hear(dating, clock, 5.0)
    for _ in range(500):  # 500 ppm, the most that adjtime(3) does, for 100 s: 50 ms
        clock.step_s(0.2 * 500e-6)
        heard += hear(dating, clock, 0.2)
    assert breaks(heard) == []


def test_a_span_heard_before_the_clock_was_set_is_dated_again_once_it_is() -> None:
    clock, dating = FedClock(wall_us=START_US - 86_400 * US_PER_S, is_set=False), Dating(RATE_HZ)
    before = hear(dating, clock, 20.0)
    assert not dating.is_trusted
    assert blocks(before)[0].started_us == START_US - 86_400 * US_PER_S
    clock.step_s(86_400.0)
    clock.is_set = True
    after = hear(dating, clock, 10.0)
    assert breaks(after) == []
    assert [one for one in after if isinstance(one, Dated)] == [Dated(moved_by_us=86_400 * US_PER_S)]
    assert dating.is_trusted
    assert blocks(after)[0].started_us == START_US + 20 * US_PER_S
    assert_unbroken(blocks(after))


def test_a_clock_set_while_nothing_is_dated_yet_needs_no_second_date() -> None:
    clock, dating = FedClock(wall_us=START_US - 86_400 * US_PER_S, is_set=False), Dating(RATE_HZ)
    heard = hear(dating, clock, 1.0)
    clock.step_s(86_400.0)
    clock.is_set = True
    heard += hear(dating, clock, 9.0)
    assert [type(one) for one in heard if not isinstance(one, Block)] == []
    assert blocks(heard)[0].started_us == START_US
    assert dating.is_trusted


def test_a_clock_that_is_not_set_and_behind_the_log_gives_a_date_after_it() -> None:
    # a board without a clock battery boots with the time at which it was switched off, or earlier
    log_until_us = START_US + 5000 * US_PER_S
    clock, dating = FedClock(is_set=False), Dating(RATE_HZ, log_until_us)
    assert blocks(hear(dating, clock, 20.0))[0].started_us == log_until_us
    clock.step_s(90_000.0)
    clock.is_set = True
    after = hear(dating, clock, 1.0)
    assert after[0] == Dated(moved_by_us=(90_000 - 5000) * US_PER_S)


@pytest.mark.parametrize("ppm", [200.0, -200.0])
def test_clocks_that_drift_apart_by_a_second_end_the_span_and_the_drift_is_known(ppm: float) -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    heard = hear(dating, clock, 1200.0, rate_hz=RATE_HZ * (1 - ppm * 1e-6))
    assert dating.drift_ppm == pytest.approx(ppm, abs=25)
    heard += hear(dating, clock, 5200.0, rate_hz=RATE_HZ * (1 - ppm * 1e-6))
    assert len(breaks(heard)) == 1  # 200 ppm make a second in 5000 s
    assert "the sample clock is 1.0 s off" in breaks(heard)[0]
    assert dating.fault is None
    # so no sample is ever dated more than about a second wrongly
    last = blocks(heard)[-1]
    ended_us = last.started_us + round(len(last.samples) * US_PER_S / RATE_HZ)
    assert abs(ended_us - clock.read().wall_us) < 1.3 * US_PER_S


@pytest.mark.parametrize(("real_hz", "how"), [(2000.0, "faster"), (500.0, "slower"), (1050.0, "5% faster")])
def test_a_wrong_rate_is_told_and_not_listened_to_until_it_is_right(real_hz: float, how: str) -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    first = hear(dating, clock, 60.0, rate_hz=real_hz)
    assert how in breaks(first)[0]
    assert dating.fault is not None
    assert blocks(hear(dating, clock, 60.0, rate_hz=real_hz)) == []
    right = hear(dating, clock, 60.0)
    assert dating.fault is None
    assert blocks(right)
    assert breaks(right + hear(dating, clock, 30.0))[1:] == []


def test_an_input_that_is_stuck_is_not_listened_to_until_it_moves() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    hear(dating, clock, 10.0)
    heard: list[Heard] = []
    for _ in range(300):
        clock.pass_s(0.2)
        heard += dating.push(np.full(200, 0.25, np.float32), clock.read())
    assert breaks(heard) == ["the input does not move: is the module powered and plugged in?"]
    assert sum(len(block.samples) for block in blocks(heard)) < 5_000
    assert dating.fault == "the input does not move"
    again = hear(dating, clock, 10.0)
    assert dating.fault is None
    assert blocks(again)[0].started_us == START_US + 70 * US_PER_S


def test_samples_that_are_no_numbers_break_the_span() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    hear(dating, clock, 10.0)
    clock.pass_s(0.2)
    broken = noise(200)
    broken[7] = np.nan
    assert dating.push(broken, clock.read()) == [
        Break(reason="samples that are no numbers", dropped_samples=200)
    ]


def test_an_end_gives_what_was_held() -> None:
    clock, dating = FedClock(), Dating(RATE_HZ)
    assert hear(dating, clock, 1.0) == []
    (block,) = blocks(dating.finish())
    assert len(block.samples) == 1000
    assert block.started_us == START_US
    assert dating.finish() == []
