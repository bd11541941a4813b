"""What a plan says of a mounting, against geometry by hand and against the simulator."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from ginnel import sim
from ginnel.errors import ExportError
from ginnel.survey.plan import Plan, make_plan, on_line
from ginnel.survey.plan_advice import advice
from ginnel.survey.plan_mountings import choices
from ginnel.survey.plan_plot import draw_plan
from ginnel.survey.plan_radar import CAR, PERSON, RadarModule
from ginnel.survey.plan_speeds import mains_lines
from ginnel.words import Aspect, FloatArray, Mounting, Sensor

CORRIDOR = Sensor(name="lane", mounting=Mounting(height_m=2.4, tilt_deg=15.0))
ROAD = Sensor(
    name="road",
    carrier_hz=24.125e9,
    max_speed_mps=60.0,
    mounting=Mounting(aspect=Aspect.OBLIQUE, height_m=3.0, offset_m=6.0, beam_angle_deg=20.0),
)


def sentences(plan: Plan) -> str:
    lines = mains_lines(plan.sensor.carrier_hz, plan.sensor.mains_hz, plan.expected, plan.bin_hz)
    return " ".join(advice(plan, lines, choices(plan)))


def test_radial_speed_along_the_path_follows_the_cosine() -> None:
    # 3-4-5 triangle: 2.4 m up is 1.4 m above a walker's centre line, so a nearest distance of 3 m
    sensor = replace(CORRIDOR, mounting=Mounting(height_m=2.4, offset_m=float(np.sqrt(9 - 1.4**2))))
    along = make_plan(sensor, RadarModule()).along(np.array([4.0]))
    assert along.range_m[0] == pytest.approx(5.0)
    assert along.cosine[0] == pytest.approx(0.8)


def test_cycles_are_half_wavelengths_of_distance_covered() -> None:
    lane = make_plan(CORRIDOR, RadarModule()).lanes_of(PERSON)[1]
    assert lane.ahead_m is not None
    assert lane.behind_m is not None
    # by hand: distance to each end of both stretches, nearest distance 1.4 m, half wavelength 14.2419 mm
    covered_m = sum(np.hypot(b, 1.4) - np.hypot(a, 1.4) for a, b in (lane.ahead_m, lane.behind_m))
    assert lane.cycles == pytest.approx(covered_m / 0.0142419, rel=2e-3)
    assert lane.dwell_s == pytest.approx(
        sum(b - a for a, b in (lane.ahead_m, lane.behind_m)) / 1.34, rel=2e-3
    )


def test_the_beam_is_taken_twice() -> None:
    # at half the horizontal width: half the power in the main lobe, and 13 dB below the axis beside it,
    # so 10^-0.3 + 10^-1.3 = 0.55131 one way, -5.17 dB there and back
    offset_m = 5 * np.tan(np.radians(40))
    mounting = Mounting(height_m=1.0, offset_m=float(offset_m), beam_width_deg=(80.0, 40.0))
    along = make_plan(replace(CORRIDOR, mounting=mounting), RadarModule()).along(np.array([5.0]))
    assert along.beam_db[0] == pytest.approx(-5.172, abs=0.002)


def test_noise_and_lowest_speed_come_from_a_bin() -> None:
    plan = make_plan(CORRIDOR, RadarModule())
    # k T0 B F with F = 20 dB is -143.975 dBm in 10 Hz, and a Hann bin is one and a half wide (Harris 1978)
    assert plan.noise_dbm == pytest.approx(-143.975 + 10 * np.log10(0.15 * plan.bin_hz), abs=0.001)
    assert plan.lowest.speed_mps == pytest.approx(2 * plan.bin_hz / 70.21524, rel=1e-5)  # half a Hann lobe


def test_a_plan_counts_on_the_weakest_of_its_movers() -> None:
    sensor = replace(ROAD, mounting=Mounting(height_m=1.0))
    plan = make_plan(sensor, RadarModule(power_mw=1e-3))
    far_m = plan.lanes_of(CAR)[1].ahead_m
    assert far_m is not None
    # there a usual car, 30 m2, has 4.77 dB more than the least of one of 10 m2
    snr_db = plan.along(np.array([far_m[1]])).car_snr_db[0]
    assert snr_db - plan.needed_snr_db == pytest.approx(4.771, abs=0.01)


def test_speeds_end_at_the_amplifier_the_sample_rate_and_the_settings() -> None:
    plan = make_plan(replace(CORRIDOR, highpass_hz=70.215), RadarModule(), sample_rate_hz=500.0)
    assert plan.lowest.speed_mps == pytest.approx(1.0, abs=1e-4)  # 70.215 Hz per m/s at 10.525 GHz
    assert "amplifier" in plan.lowest.set_by
    assert plan.highest.speed_mps == pytest.approx(250 / 70.21524, rel=1e-5)
    assert "sample rate" in plan.highest.set_by
    plan = make_plan(CORRIDOR, RadarModule(lowpass_hz=280.861))
    assert plan.highest.speed_mps == pytest.approx(4.0, abs=1e-4)
    assert make_plan(CORRIDOR, RadarModule()).highest.speed_mps == 5.0


def test_levels_have_the_shape_that_the_simulator_makes() -> None:
    # the simulator has its own antenna and geometry; the floors beside their main lobes differ
    mounting = Mounting(height_m=2.4, tilt_deg=8.0, beam_width_deg=(80.0, 40.0))
    x_m = np.array([3.0, 5.0, 8.0, 12.0, 20.0])
    along = make_plan(replace(CORRIDOR, mounting=mounting), RadarModule()).along(x_m)
    body_m = np.stack([x_m, np.zeros(5), np.ones(5)], -1)[None]
    _, amplitude = sim.sensor.echo_paths(body_m, np.ones((1, 5)), mounting, sim.Beam(), ())
    simulated_db = 20 * np.log10(amplitude[0])
    difference_db: FloatArray = along.person_dbm - simulated_db
    assert np.ptp(difference_db) < 1.0


def test_a_weaker_module_hears_less_far_by_the_fourth_root() -> None:
    sensor = replace(ROAD, mounting=Mounting(height_m=1.0))  # looks straight along it
    reach_m = []
    for power_mw in (1e-3, 1e-3 / 16):
        lane = make_plan(sensor, RadarModule(power_mw=power_mw)).lanes_of(CAR)[1]
        assert lane.ahead_m is not None
        reach_m.append(lane.ahead_m[1])
    assert reach_m[0] < 149
    # a sixteenth of the power is half the range
    assert reach_m[0] / reach_m[1] == pytest.approx(2.0, rel=2e-3)


def test_the_far_edge_is_farther_on_either_side_of_the_sensor() -> None:
    for offset_m in (3.0, -3.0):
        near, far = (on_line(Mounting(offset_m=offset_m), y_m).offset_m for y_m in (-1.0, 1.0))
        assert (abs(near), abs(far)) == (2.0, 4.0)


def test_a_corridor_is_countable_and_a_car_there_too_fast() -> None:
    plan = make_plan(CORRIDOR, RadarModule())
    assert plan.expected is PERSON
    assert all(lane.is_countable for lane in plan.lanes_of(PERSON))
    assert not any(lane.is_countable for lane in plan.lanes_of(CAR))
    assert "can be counted over the whole width" in sentences(plan)
    assert "100 Hz would look like 1.42 m/s" in sentences(plan)


def test_a_road_is_countable_at_24_ghz() -> None:
    plan = make_plan(ROAD, RadarModule(), path_width_m=6.0)
    assert plan.expected is CAR
    assert all(lane.is_countable for lane in plan.lanes_of(CAR))


def test_a_deaf_module_is_told_as_such() -> None:
    plan = make_plan(CORRIDOR, RadarModule(power_mw=1e-3, noise_figure_db=60, loss_db=40))
    assert "cannot be counted with this mounting: its echo is too weak" in sentences(plan)
    assert "No mounting tried counts" in sentences(plan)


def test_a_beam_that_looks_away_is_told_as_such() -> None:
    away = Mounting(aspect=Aspect.OBLIQUE, offset_m=-4.0, beam_angle_deg=80.0, beam_width_deg=(30.0, 30.0))
    assert "misses the path" in sentences(make_plan(replace(CORRIDOR, mounting=away), RadarModule()))
    assert "misses the path" not in sentences(make_plan(CORRIDOR, RadarModule()))


def test_an_impossible_antenna_and_a_slow_recorder_are_told() -> None:
    wide = replace(CORRIDOR, mounting=Mounting(beam_width_deg=(80.0, 40.0)))
    assert "cannot gain 20 dBi, at most 11.1" in sentences(make_plan(wide, RadarModule(gain_dbi=20)))
    assert "Record at 878 Hz or more" in sentences(make_plan(wide, RadarModule(), sample_rate_hz=600))


def test_from_the_side_of_a_wide_path_a_place_over_it_is_better() -> None:
    plan = make_plan(
        replace(CORRIDOR, mounting=Mounting(height_m=2.4, offset_m=4.0)), RadarModule(), path_width_m=3.0
    )
    best = choices(plan)[0]
    assert best.name.startswith("over the middle")
    # by hand: 1.5 m to the side, 1.4 m below
    assert best.farthest_m == pytest.approx(2.052, abs=1e-3)
    assert f"Better, if it can be had: {best.name}" in sentences(plan)


def test_a_mounting_whose_near_side_hides_the_far_one_comes_after_those_that_hear_both_alike() -> None:
    narrow = replace(ROAD.mounting, beam_width_deg=(30.0, 30.0))
    plan = make_plan(replace(ROAD, mounting=narrow), RadarModule(), path_width_m=6.0)
    ranked = [choice for choice in choices(plan) if choice.is_countable]
    beside = next(choice for choice in ranked if choice.name == "beside the path, along it")
    assert beside.unevenness_db > 17.0
    assert [choice.is_even for choice in ranked] == sorted((c.is_even for c in ranked), reverse=True)
    assert ranked[-1] is beside
    assert "hide it when both pass at once" not in sentences(plan)
    along = replace(beside.mounting, beam_width_deg=(30.0, 30.0))
    uneven = make_plan(replace(ROAD, mounting=along), RadarModule(), path_width_m=6.0)
    assert "hide it when both pass at once" in sentences(uneven)


def test_sizes_that_are_none_are_refused() -> None:
    with pytest.raises(ValueError, match="must be positive"):
        make_plan(CORRIDOR, RadarModule(), path_width_m=0)


def test_a_picture_without_its_library_says_what_to_install(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "matplotlib.figure", None)
    with pytest.raises(ExportError, match="pip install matplotlib"):
        draw_plan(make_plan(CORRIDOR, RadarModule()), tmp_path / "plan.svg")


def test_the_picture_names_its_curves(tmp_path: Path) -> None:
    plan = make_plan(CORRIDOR, RadarModule())
    draw_plan(plan, tmp_path / "plan.png")
    assert (tmp_path / "plan.png").read_bytes().startswith(b"\x89PNG")
    draw_plan(plan, tmp_path / "plan.svg")
    assert ElementTree.parse(tmp_path / "plan.svg").getroot().tag == "{http://www.w3.org/2000/svg}svg"
    text = (tmp_path / "plan.svg").read_text("utf-8")
    for name in ("near edge", "far edge", "person, 1 m", "100 Hz"):
        assert f"<!-- {name}" in text or f"<!--  {name}" in text, name
    with pytest.raises(ExportError, match=r"a \.png or an \.svg"):
        draw_plan(plan, tmp_path / "plan.pdf")
    with pytest.raises(ExportError, match="cannot be written"):
        draw_plan(plan, tmp_path / "nowhere" / "plan.svg")
