"""Speed, frequency and geometry against tables computed apart from this code.

Grouped: Doppler constants, tuning forks, lamp lines, geometry, errors. Where no other source is
named, values were worked out by hand from f = 2 v f0 / c with c = 299 792 458 m/s (SI, exact).
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.doppler.kinematics import C_MPS, cosine, hz_per_mps, nearest_distance_m, range_m, wavelength_m
from ginnel.words import Mounting

#: Carrier GHz, wavelength mm, Hz per m/s, m/s that a 440 Hz fork (ISO 16, A4) reads, Hz at 1.34 m/s.
DOPPLER = [
    (5.800, 51.6884, 38.69344, 11.37144, 51.849),
    (9.350, 32.0634, 62.37649, 7.05394, 83.584),
    (10.525, 28.4838, 70.21524, 6.26645, 94.088),
    (10.587, 28.3170, 70.62886, 6.22975, 94.643),
    (24.125, 12.4266, 160.94468, 2.73386, 215.666),
    (24.150, 12.4138, 161.11146, 2.73103, 215.889),
    (34.700, 8.6396, 231.49348, 1.90070, 310.201),
]
MPH_MPS = 0.44704  # exact


def test_the_speed_of_light_is_the_si_value() -> None:
    assert C_MPS == 299_792_458


@pytest.mark.parametrize(("ghz", "wavelength_mm", "per_mps", "fork_mps", "walk_hz"), DOPPLER)
def test_doppler_constants_hold_from_5_8_to_34_7_ghz(
    ghz: float, wavelength_mm: float, per_mps: float, fork_mps: float, walk_hz: float
) -> None:
    assert wavelength_m(ghz * 1e9) * 1e3 == pytest.approx(wavelength_mm, rel=1e-5)
    assert hz_per_mps(ghz * 1e9) == pytest.approx(per_mps, rel=1e-6)
    assert 440 / hz_per_mps(ghz * 1e9) == pytest.approx(fork_mps, rel=1e-5)
    assert 1.34 * hz_per_mps(ghz * 1e9) == pytest.approx(walk_hz, rel=1e-5)


@pytest.mark.parametrize(
    ("ghz", "mph", "fork_hz"),
    [
        (10.525, 25, 784.73),
        (10.525, 50, 1569.45),
        (10.525, 65, 2040.29),
        (24.150, 25, 1800.58),
        (24.150, 50, 3601.16),
        (24.150, 65, 4681.51),
    ],
)
def test_forks_stamped_in_miles_an_hour_ring_as_they_should(ghz: float, mph: float, fork_hz: float) -> None:
    assert mph * MPH_MPS * hz_per_mps(ghz * 1e9) == pytest.approx(fork_hz, abs=0.01)


def test_a_hydrologists_fork_reads_its_published_speed() -> None:
    # USGS notes on surface-velocity radars: 1055 Hz at 24.150 GHz is 21.5 ft/s, with a rounded c.
    assert 1055 / hz_per_mps(24.150e9) / 0.3048 == pytest.approx(21.5, abs=0.05)


@pytest.mark.parametrize(
    ("line_hz", "x_band_mps", "k_band_mps"),
    [(100, 1.4242, 0.6213), (120, 1.7090, 0.7456), (200, 2.8484, 1.2427), (600, 8.5452, 3.7280)],
)
def test_lamp_lines_read_as_walking_speeds(line_hz: float, x_band_mps: float, k_band_mps: float) -> None:
    assert line_hz / hz_per_mps(10.525e9) == pytest.approx(x_band_mps, abs=1e-4)
    assert line_hz / hz_per_mps(24.125e9) == pytest.approx(k_band_mps, abs=1e-4)


def test_a_carrier_told_wrongly_gives_the_stated_error() -> None:
    assert hz_per_mps(10.587e9) / hz_per_mps(10.525e9) - 1 == pytest.approx(0.00589, abs=1e-5)


@pytest.mark.parametrize(
    ("angle_deg", "share"), [(15, 0.96593), (20, 0.93969), (30, 0.86603), (45, 0.70711), (60, 0.5)]
)
def test_cosine_error_at_the_usual_angles(angle_deg: float, share: float) -> None:
    x_m = 2.0 / np.tan(np.deg2rad(angle_deg))
    assert cosine(np.array([x_m, -x_m]), 2.0) == pytest.approx([share, -share], abs=1e-5)


def test_the_sensor_itself_has_no_line_of_sight_angle() -> None:
    assert cosine(np.array([0.0, 3.0]), 0.0).tolist() == [0.0, 1.0]


def test_distance_is_pythagoras() -> None:
    assert range_m(np.array([3.0, -4.0, 0.0]), 4.0) == pytest.approx([5.0, np.sqrt(32), 4.0])


def test_height_counts_as_offset() -> None:
    # 1.2 m above a walker's centre line and 0.5 m aside: 1.3 m.
    assert nearest_distance_m(Mounting(height_m=2.2, offset_m=0.5)) == pytest.approx(1.3)


@given(x_m=st.floats(0.01, 100), offset_m=st.floats(0.01, 20))
def test_cosine_is_the_slope_of_distance(x_m: float, offset_m: float) -> None:
    step_m = 1e-6 * np.hypot(x_m, offset_m)
    near, far = range_m(np.array([x_m - step_m, x_m + step_m]), offset_m)
    assert cosine(np.array([x_m]), offset_m)[0] == pytest.approx((far - near) / (2 * step_m), abs=1e-6)


@pytest.mark.parametrize("carrier_hz", [0.0, -1.0, np.inf, np.nan])
def test_carriers_that_cannot_be_are_refused(carrier_hz: float) -> None:
    with pytest.raises(ValueError, match="carrier_hz"):
        hz_per_mps(carrier_hz)
