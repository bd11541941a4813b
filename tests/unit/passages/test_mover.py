"""A mover's line: against a directly written formula, and its power over bins."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.doppler.frames import plan_frames
from ginnel.passages.mover import Mover, line_of, line_shape
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB, Site
from ginnel.words import Channels, Mounting, Sensor

SITES = {}
for channels in Channels:
    sensor = Sensor(name="s", channels=channels, mounting=Mounting(height_m=2.4, tilt_deg=15.0))
    SITES[channels] = Site(sensor, plan_frames(sensor, 4000.0))
TIMES_S = np.arange(0.0, 30.0, 0.045)


def mover(**changes: object) -> Mover:
    values: dict[str, object] = {
        "crossed_s": 15.0,
        "speed_mps": 1.3,
        "sign": 1,
        "offset_m": 1.4,
        "level": np.full(N_ZONES, 20.0 * NEPERS_PER_DB),
    }
    return Mover(**{**values, **changes})  # type: ignore[arg-type]  # a test's own keyword mix


@pytest.mark.parametrize("channels", list(Channels))
@given(
    crossed_s=st.floats(-5, 35),
    speed_mps=st.floats(0.2, 6),
    sign=st.sampled_from([1, -1]),
    offset_m=st.floats(0.3, 5),
)
def test_the_line_is_the_doppler_shift_of_the_geometry(
    channels: Channels, crossed_s: float, speed_mps: float, sign: int, offset_m: float
) -> None:
    site = SITES[channels]
    line = line_of(
        site, mover(crossed_s=crossed_s, speed_mps=speed_mps, sign=sign, offset_m=offset_m), TIMES_S
    )

    # Distance written out and differentiated numerically: f = -2 dR/dt f0 / c, positive when nearing.
    def distance(
        t: np.ndarray[tuple[int], np.dtype[np.float64]],
    ) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        return np.asarray(np.sqrt((speed_mps * (t - crossed_s)) ** 2 + offset_m**2))

    shift_hz = -(distance(TIMES_S + 1e-5) - distance(TIMES_S - 1e-5)) / 2e-5 * 2 * 10.525e9 / 299_792_458
    if channels is Channels.MONO:
        shift_hz = np.abs(shift_hz)
    np.testing.assert_allclose(line.centre * site.plan.bin_hz, shift_hz, atol=2e-3)
    # x is positive on the side that the beam looks at: before the crossing when approaching.
    np.testing.assert_allclose(line.x_m, sign * speed_mps * (crossed_s - TIMES_S), atol=1e-9)
    np.testing.assert_allclose(np.exp(line.log_range), distance(TIMES_S), rtol=1e-9)


def test_the_level_is_the_sites_curve_and_the_movers_own() -> None:
    site = SITES[Channels.MONO]
    level = np.array([1.0, 2.0, 3.0, 4.0, 5.0])
    line = line_of(site, mover(level=level), TIMES_S)
    # Zone levels are joined by straight lines over log distance.
    own = np.interp(line.log_range, site.zone_edges, level)
    np.testing.assert_allclose(line.log_power, site.nominal_level(line.x_m) + own, atol=1e-9)


def test_drift_changes_the_speed_zone_by_zone() -> None:
    site = SITES[Channels.IQ]
    steady = line_of(site, mover(), TIMES_S)
    drifting = line_of(site, mover(drift=np.array([0.0, 0.0, 0.1, 0.0, 0.0])), TIMES_S)
    share = np.interp(steady.log_range, site.zone_edges, [0.0, 0.0, 0.1, 0.0, 0.0])
    np.testing.assert_allclose(drifting.centre, steady.centre * (1 + share), atol=1e-9)


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("sign", [1, -1])
def test_a_lines_cells_sum_to_its_power(channels: Channels, sign: int) -> None:
    site = SITES[channels]
    line = line_of(site, mover(sign=sign), TIMES_S)
    inside = (np.abs(line.centre) > 8) & (np.abs(line.centre) < 60)
    bins = np.arange(-100, 101) if channels is Channels.IQ else np.arange(0, 101)
    shape = line_shape(site, line, np.broadcast_to(bins, (len(TIMES_S), len(bins))))
    np.testing.assert_allclose(shape.sum(axis=1)[inside], np.exp(line.log_power)[inside], rtol=0.01)
    assert (shape >= 0).all()


def test_no_line_is_narrower_than_a_hann_frames_lobe() -> None:
    # 1.44 bins at half power (Harris 1978, Table 1) is 0.61 as a standard deviation.
    width = line_of(SITES[Channels.MONO], mover(speed_mps=0.01), TIMES_S).width
    assert width.min() == pytest.approx(1.44 / 2.355, rel=0.01)


def test_variants_are_the_lines_of_other_movers() -> None:
    site = SITES[Channels.IQ]
    point = np.array([[15.0, 14.0], [1.3, 2.0], [1.4, 0.9]])
    both = line_of(site, mover(), TIMES_S, point)
    for i, (crossed_s, speed_mps, offset_m) in enumerate(point.T):
        alone = line_of(site, mover(crossed_s=crossed_s, speed_mps=speed_mps, offset_m=offset_m), TIMES_S)
        np.testing.assert_allclose(both.centre[i], alone.centre)
        np.testing.assert_allclose(both.log_power[i], alone.log_power)
        np.testing.assert_allclose(both.width[i], alone.width)
