"""Radar equation, noise and power density against published and hand-reckoned numbers.

"By formula" rows were reckoned apart from this code, with c = 299 792 458 m/s and k = 1.380649e-23 J/K.
"""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.survey.plan_radar import (
    CAR,
    PERSON,
    RadarModule,
    field_v_m,
    most_gain_dbi,
    needed_snr_db,
    noise_dbm,
    power_density_w_m2,
    public_reference_w_m2,
    received_dbm,
)

X_BAND_HZ = 10.525e9
MODULE = RadarModule(power_mw=20.0, gain_dbi=8.0, noise_figure_db=20.0)


@pytest.mark.parametrize(
    ("distance_m", "section_m2", "dbm"),
    [
        # by formula: Pt G^2 lambda^2 sigma / ((4 pi)^3 R^4)
        (2.0, 1.0, -46.915),
        (5.0, 1.0, -62.833),
        (10.0, 1.0, -74.874),
        (15.0, 1.0, -81.918),
        (20.0, 1.0, -86.915),
        (30.0, 1.0, -93.959),
        (50.0, 1.0, -102.833),
        # the ends of what Schultz, Burgener and King (Proc. IRE 46(2), 1958) measured on a man at 9.375 GHz
        (10.0, 0.495, -77.928),
        (10.0, 1.22, -74.010),
    ],
)
def test_an_echo_has_the_power_of_the_radar_equation(
    distance_m: float, section_m2: float, dbm: float
) -> None:
    found = received_dbm(MODULE, X_BAND_HZ, section_m2, np.array([distance_m]))
    assert found[0] == pytest.approx(dbm, abs=0.001)


def test_double_the_distance_costs_12_db_and_losses_their_own() -> None:
    near, far = received_dbm(MODULE, X_BAND_HZ, 1.0, np.array([7.0, 14.0]))
    assert near - far == pytest.approx(12.0412, abs=1e-4)  # 40 log10 2
    lossy = RadarModule(power_mw=20.0, gain_dbi=8.0, loss_db=3.5)
    assert near - received_dbm(lossy, X_BAND_HZ, 1.0, np.array([7.0]))[0] == pytest.approx(3.5)
    off_axis = received_dbm(MODULE, X_BAND_HZ, 1.0, np.array([7.0]), -3.0)[0]
    assert near - off_axis == pytest.approx(6.0)  # out and back


@pytest.mark.parametrize(
    ("bandwidth_hz", "dbm"), [(10, -143.975), (100, -133.975), (1000, -123.975)]
)  # k T0 B F by formula, T0 = 290 K, F = 20 dB
def test_the_receivers_noise_is_thermal_times_its_figure(bandwidth_hz: float, dbm: float) -> None:
    assert noise_dbm(MODULE, bandwidth_hz) == pytest.approx(dbm, abs=0.001)


def test_flicker_doubles_the_noise_at_its_corner_and_grows_tenfold_a_decade_below() -> None:
    flickering = RadarModule(flicker_corner_hz=100.0)
    above_db = noise_dbm(flickering, 10, np.array([100.0, 1.0, 0.1, np.inf])) - noise_dbm(flickering, 10)
    assert above_db[0] == pytest.approx(3.0103, abs=1e-4)
    assert above_db[2] - above_db[1] == pytest.approx(10.0, abs=0.05)
    assert above_db[3] == 0.0


def test_the_distance_where_noise_alone_ends_it() -> None:
    # by formula: noise figure 20 dB, 100 Hz, 1 m^2, 10, 13.11 (Albersheim's 13.1145) and 20 dB wanted
    for wanted_db, distance_m in ((10.0, 168.86), (13.1145, 141.15), (20.0, 94.96)):
        level_dbm = received_dbm(MODULE, X_BAND_HZ, 1.0, np.array([distance_m]))[0]
        assert level_dbm - noise_dbm(MODULE, 100.0) == pytest.approx(wanted_db, abs=0.003)


def test_a_fluctuating_target_needs_21_db() -> None:
    # Swerling's first case, one sample, Pd 0.9, Pfa 1e-6: 21.14 dB by the closed form
    assert needed_snr_db(0.9, 1e-6) == pytest.approx(21.14, abs=0.005)


def test_that_need_is_what_exponential_cells_show() -> None:
    false_alarm_rate = 1e-3
    snr = 10 ** (needed_snr_db(0.8, false_alarm_rate) / 10)
    power = np.random.default_rng(7).exponential(1 + snr, 200_000)  # signal and noise both Gaussian
    # four standard errors of a share of 0.8
    assert np.mean(power > -np.log(false_alarm_rate)) == pytest.approx(0.8, abs=4 * np.sqrt(0.16 / 200_000))


@pytest.mark.parametrize("rates", [(0.5, 0.5), (0.1, 0.2), (1.0, 1e-3), (0.9, 0.0)])
def test_rates_out_of_order_are_refused(rates: tuple[float, float]) -> None:
    with pytest.raises(ValueError, match="must lie below"):
        needed_snr_db(*rates)


@pytest.mark.parametrize(
    ("distance_m", "w_m2"), [(1.0, 0.01004), (0.5, 0.0402), (0.2, 0.2510), (0.1, 1.0042)]
)  # EIRP 0.12619 W over 4 pi R^2, by formula
def test_power_density_falls_with_the_square(distance_m: float, w_m2: float) -> None:
    assert MODULE.eirp_dbm == pytest.approx(21.010, abs=0.001)
    found = power_density_w_m2(MODULE, np.array([distance_m]))[0]
    assert found == pytest.approx(w_m2, rel=2e-3)


def test_the_field_at_3_m() -> None:
    # sqrt(30 x 0.12619 W) / 3 m by hand; and 47 CFR 15.245's 2500 mV/m is an EIRP of 1.875 W, 32.730 dBm
    assert field_v_m(MODULE, 3.0) == pytest.approx(0.6486, abs=1e-4)
    assert field_v_m(RadarModule(power_mw=1875.0, gain_dbi=0.0), 3.0) == pytest.approx(2.5, abs=1e-6)


def test_the_public_reference_level_is_icnirps() -> None:
    # ICNIRP 2020, general public, local, over 6 to 300 GHz: 55 f^-0.177, as reprinted in textbooks
    assert public_reference_w_m2(10.525e9) == pytest.approx(36.26, abs=0.005)
    assert public_reference_w_m2(24.125e9) == pytest.approx(31.31, abs=0.005)
    assert public_reference_w_m2(5.8e9) is None


def test_a_beam_bounds_its_gain() -> None:
    # Kraus's 41 253 square degrees over 80 by 40 by hand: 12.89, which is 11.10 dB
    assert most_gain_dbi((80.0, 40.0)) == pytest.approx(11.10, abs=0.01)


def test_targets_carry_the_published_sections() -> None:
    assert (PERSON.low_m2, PERSON.high_m2) == (0.495, 1.22)  # Schultz, Burgener, King 1958
    for target in (PERSON, CAR):
        assert target.low_m2 < target.usual_m2 < target.high_m2
