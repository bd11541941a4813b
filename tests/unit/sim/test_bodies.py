"""Bodies: gait against published check numbers, then what limbs and wheels must do by mechanics.

Gait figures: Boulic, Thalmann, Thalmann, The Visual Computer 6 (1990) 344-358, recomputed from its
constants for stature 1.75 m; tolerance 1e-3.
"""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.sim.bodies import CAR, Cyclist, Vehicle, Walker, cycle_length_m, cycle_s, support_s

# speed m/s, cycle length m, cycle s, steps/min, support s, peak torso speed swing m/s
GAIT = [
    (0.60, 0.9665, 1.6108, 74.50, 1.0683, 0.164),
    (1.00, 1.2477, 1.2477, 96.18, 0.7953, 0.212),
    (1.34, 1.4443, 1.0778, 111.33, 0.6675, 0.245),
    (1.80, 1.6739, 0.9300, 129.04, 0.5563, 0.284),
    (2.00, 1.7645, 0.8822, 136.02, 0.5204, 0.299),
]


@pytest.mark.parametrize(("speed_mps", "length_m", "duration_s", "cadence", "on_floor_s", "swing_mps"), GAIT)
def test_gait_keeps_to_the_published_model(
    speed_mps: float, length_m: float, duration_s: float, cadence: float, on_floor_s: float, swing_mps: float
) -> None:
    assert cycle_length_m(speed_mps) == pytest.approx(length_m, abs=1e-3)
    assert cycle_s(speed_mps) == pytest.approx(duration_s, abs=1e-3)
    assert support_s(speed_mps) == pytest.approx(on_floor_s, abs=1e-3)
    rate_hz = Walker().cycle_rate_hz(np.array([speed_mps]))
    assert 120 * rate_hz[0] == pytest.approx(cadence, abs=0.1)
    # The torso as the simulator really moves it, differentiated.
    times_s = np.linspace(0, 2 * duration_s, 4001)
    torso = Walker().torso_m(times_s * rate_hz, np.full(4001, speed_mps))
    swing = np.gradient(torso[:, 0], times_s)
    assert np.abs(swing).max() == pytest.approx(swing_mps, abs=1e-3)


def test_feet_swing_at_three_to_four_times_walking_speed_and_stand_in_between() -> None:
    # About three times is common knowledge of gait radar, no source; this model's knee, 70 degrees in a
    # quarter of a cycle, makes it four. A standing foot is at rest.
    speed_mps = 1.34
    times_s = np.linspace(0, 5, 5001)
    walker = Walker()
    rate_hz = walker.cycle_rate_hz(np.array([speed_mps]))
    places = walker.places_m(times_s * rate_hz, np.full(5001, speed_mps))
    foot = speed_mps + np.gradient(places[6, :, 0], times_s)
    assert 2.7 * speed_mps < foot.max() < 4.5 * speed_mps
    on_floor = np.sort(np.abs(foot))[: len(foot) // 3]
    assert on_floor.mean() < 0.3 * speed_mps


def test_left_and_right_move_alike_half_a_cycle_apart() -> None:
    phase = np.linspace(0, 1, 50)
    speed = np.full(50, 1.2)
    walker = Walker()
    sway = walker.torso_m(phase, speed)
    later_sway = walker.torso_m(phase + 0.5, speed)
    left = (walker.places_m(phase, speed) - sway)[2:7]
    right = (walker.places_m(phase + 0.5, speed) - later_sway)[7:12]
    np.testing.assert_allclose(left[..., [0, 2]], right[..., [0, 2]], atol=1e-12)
    np.testing.assert_allclose(left[..., 1], -right[..., 1], atol=1e-12)


def test_who_stands_still_does_not_swing() -> None:
    phase = np.linspace(0, 1, 50)
    places = Walker().places_m(phase, np.zeros(50))
    assert np.ptp(places, axis=1).max() < 1e-12


@pytest.mark.parametrize("body", [Cyclist(), CAR])
def test_wheels_roll_without_slipping(body: Cyclist | Vehicle) -> None:
    # A rim's point runs between rest (on the road) and twice the speed (on top).
    speed_mps = 10.0
    times_s = np.linspace(0, 1, 20001)
    rate_hz = body.cycle_rate_hz(np.array([speed_mps]))
    rim = body.places_m(times_s * rate_hz, np.full(20001, speed_mps))[-1]
    forward = speed_mps + np.gradient(rim[:, 0], times_s)
    assert forward.max() == pytest.approx(2 * speed_mps, rel=1e-3)
    assert abs(forward.min()) < 0.01
    assert rim[:, 2].min() == pytest.approx(0.0, abs=1e-4)


def test_a_vehicle_shows_the_face_that_looks_at_the_sensor() -> None:
    front, rear = Vehicle(power_m2=10).powers(np.array([1.0, -1.0]))[[0, 3]]
    assert front[0] == pytest.approx(10.0)
    assert rear[1] == pytest.approx(10.0)
    assert front[1] < 0.02
    assert rear[0] < 0.02


def test_limbs_can_be_as_strong_as_the_torso() -> None:
    """The thigh's share is 0.35: 10 log10(1 / 0.35) = 4.56 dB. Torso and head stay as they are."""
    powers = Walker(limbs_db=4.56).powers(np.zeros(1))[:, 0]
    assert powers[[4, 9]] == pytest.approx([1.0, 1.0], abs=1e-3)
    assert powers[:2] == pytest.approx([1.0, 0.1])
