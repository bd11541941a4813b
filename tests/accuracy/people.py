"""Rows about people: alone, crossing each other, following, slow, turning back, on wheels, beside lamps."""

from __future__ import annotations

from functools import partial

import numpy as np
from tests.accuracy import places
from tests.accuracy.cases import Case, Goals, Row

from ginnel import sim
from ginnel.doppler.kinematics import hz_per_mps
from ginnel.words import Channels, Direction, Sensor

MONO, IQ = Channels.MONO, Channels.IQ
IQ_ERROR = sim.IqError(gain_db=1.5, phase_deg=10.0)


def new_site(seed: int) -> Case:
    """The first ten passages, with nothing learnt."""
    rng = np.random.default_rng([seed, 1])
    movers, until_s = places.one_by_one(rng, 10)
    return places.corridor_case(movers, until_s, seed=seed)


def singles(
    seed: int,
    *,
    channels: Channels = MONO,
    snr_db: tuple[float, float],
    iq: sim.IqError | None = None,
    n: int = 20,
) -> Case:
    """Walkers one at a time in a corridor."""
    rng = np.random.default_rng([seed, 2])
    first, learnt_s = places.learnt(rng)
    movers, until_s = places.one_by_one(rng, n, from_s=learnt_s)
    receiver = sim.Receiver(iq=iq, offset=0.02 + 0.01j, offset_drift=0.05 - 0.03j) if iq else sim.Receiver()
    return places.corridor_case(
        first + movers,
        until_s,
        seed=seed,
        learnt_s=learnt_s,
        sensor=places.corridor(channels),
        peak_snr_db=float(rng.uniform(*snr_db)),
        receiver=receiver,
    )


def oblique(seed: int, *, channels: Channels, n: int = 20) -> Case:
    """Walkers past a sensor beside the path; each seed has its own angle and offset."""
    rng = np.random.default_rng([seed, 3])
    offset_m = float(rng.uniform(1.0, 4.0))
    sensor = places.wayside(channels, angle_deg=float(rng.uniform(30.0, 60.0)), offset_m=offset_m)
    walks = partial(places.walks, centre_m=offset_m, behind_m=10.0)
    first, learnt_s = places.learnt(rng, 14, walks, alone_s=24.0)
    movers, until_s = places.one_by_one(rng, n, walks, from_s=learnt_s, alone_s=28.0)
    return places.corridor_case(
        first + movers, until_s, seed=seed, learnt_s=learnt_s, sensor=sensor, ends_at_sensor=False
    )


def opposing(seed: int, *, channels: Channels, n: int = 12) -> Case:
    """Pairs that cross each other: both are heard at once, their crossings up to five seconds apart."""
    rng = np.random.default_rng([seed, 4])
    movers, learnt_s = places.learnt(rng)
    at_s = learnt_s
    for _ in range(n):
        at_s += 26.0 + float(rng.exponential(4.0))
        apart_s = float(rng.uniform(-5.0, 5.0))
        movers.append(places.walks(rng, at_s, direction=Direction.APPROACHING))
        movers.append(places.walks(rng, at_s + apart_s, direction=Direction.RECEDING))
    return places.corridor_case(
        movers, at_s + 20.0, seed=seed, learnt_s=learnt_s, sensor=places.corridor(channels)
    )


def followers(seed: int, *, headway_s: float, channels: Channels = MONO, n: int = 12) -> Case:
    """Pairs of one way and one speed, one behind the other."""
    rng = np.random.default_rng([seed, 5])
    movers, learnt_s = places.learnt(rng)
    at_s = learnt_s
    for _ in range(n):
        at_s += 26.0 + float(rng.exponential(4.0))
        speed_mps, direction = places.walking_speed_mps(rng), places.way(rng)
        movers += [
            places.walks(rng, at_s + behind_s, speed_mps=speed_mps, direction=direction)
            for behind_s in (0.0, headway_s)
        ]
    return places.corridor_case(
        movers, at_s + 20.0, seed=seed, learnt_s=learnt_s, sensor=places.corridor(channels)
    )


def slow(seed: int, *, n: int = 10) -> Case:
    """People who hardly move, 0.4 to 0.7 m/s."""
    rng = np.random.default_rng([seed, 6])
    first, learnt_s = places.learnt(rng)

    def creeps(rng: np.random.Generator, crossed_s: float) -> sim.Mover:
        return places.walks(rng, crossed_s, speed_mps=float(rng.uniform(0.4, 0.7)))

    movers, until_s = places.one_by_one(rng, n, creeps, from_s=learnt_s + 20.0, alone_s=40.0)
    return places.corridor_case(first + movers, until_s + 20.0, seed=seed, learnt_s=learnt_s)


def stopping(seed: int, *, n: int = 14) -> Case:
    """People who stop in the beam for 3 to 10 s and go on: one passage each."""
    rng = np.random.default_rng([seed, 7])
    first, learnt_s = places.learnt(rng)

    def stops(rng: np.random.Generator, started_s: float) -> sim.Mover:
        return sim.stopper(
            started_s=started_s,
            speed_mps=places.walking_speed_mps(rng),
            direction=places.way(rng),
            stop_at_m=float(rng.uniform(2.0, 8.0)),
            dwell_s=float(rng.uniform(3.0, 10.0)),
            y_m=float(rng.normal(0.0, 0.3)),
            power_db=float(rng.normal(0.0, 1.5)),
            seed=int(rng.integers(2**31)),
        )

    movers, until_s = places.one_by_one(rng, n, stops, from_s=learnt_s, alone_s=34.0)
    return places.corridor_case(first + movers, until_s + 20.0, seed=seed, learnt_s=learnt_s)


def not_passing(seed: int, *, n: int = 20) -> Case:
    """People who turn back after a while, stand about or fidget."""
    rng = np.random.default_rng([seed, 8])
    movers, learnt_s = places.learnt(rng)

    def lingers(rng: np.random.Generator, started_s: float) -> sim.Mover:
        y_m, power_db = float(rng.normal(0.0, 0.3)), float(rng.normal(0.0, 1.5))
        body_seed = int(rng.integers(2**31))
        if rng.uniform() < 0.6:
            return sim.turner(
                started_s=started_s,
                speed_mps=places.walking_speed_mps(rng),
                turn_at_m=float(rng.uniform(1.0, 8.0)),
                dwell_s=float(rng.uniform(0.3, 5.0)),
                y_m=y_m,
                power_db=power_db,
                seed=body_seed,
            )
        return sim.loiterer(
            started_s=started_s,
            duration_s=float(rng.uniform(8.0, 25.0)),
            at_m=float(rng.uniform(1.5, 7.0)),
            reach_m=float(rng.uniform(0.2, 0.7)),
            y_m=y_m,
            power_db=power_db,
            seed=body_seed,
        )

    others, until_s = places.one_by_one(rng, n, lingers, from_s=learnt_s, alone_s=40.0)
    return places.corridor_case(movers + others, until_s + 25.0, seed=seed, learnt_s=learnt_s)


def mixed(seed: int, *, channels: Channels = MONO, n: int = 24) -> Case:
    """Runners, cyclists and people with trolleys among walkers."""
    rng = np.random.default_rng([seed, 9])
    first, learnt_s = places.learnt(rng)
    sensor = places.corridor(channels, max_speed_mps=9.0, speed_bands_mps=(1.0, 2.0, 4.0))

    def anybody(rng: np.random.Generator, crossed_s: float) -> sim.Mover:
        direction, y_m = places.way(rng), float(rng.normal(0.0, 0.3))
        power_db, body_seed = float(rng.normal(0.0, 1.5)), int(rng.integers(2**31))
        kind = int(rng.integers(4))
        if kind == 0:
            return places.walks(rng, crossed_s)
        maker, speeds_mps = (
            (sim.runner, (2.3, 4.0)),
            (sim.trolley, (0.8, 1.5)),
            (sim.cyclist, (2.5, 6.5)),
        )[kind - 1]
        return maker(
            crossed_s=crossed_s,
            speed_mps=float(rng.uniform(*speeds_mps)),
            direction=direction,
            y_m=y_m,
            power_db=power_db + (2.0 if kind == 3 else 0.0),
            seed=body_seed,
        )

    movers, until_s = places.one_by_one(rng, n, anybody, from_s=learnt_s)
    return places.corridor_case(first + movers, until_s, seed=seed, learnt_s=learnt_s, sensor=sensor)


def on_the_lamp_line(seed: int, *, mains_hz: float, n: int = 16) -> Case:
    """Walkers whose Doppler is twice the mains frequency, beneath lamps that flicker with it."""
    rng = np.random.default_rng([seed, 10])
    sensor: Sensor = places.corridor(mains_hz=mains_hz)
    first, learnt_s = places.learnt(rng)

    def exactly(rng: np.random.Generator, crossed_s: float) -> sim.Mover:
        speed_mps = 2 * mains_hz / hz_per_mps(sensor.carrier_hz)
        return places.walks(rng, crossed_s, speed_mps=speed_mps)

    movers, until_s = places.one_by_one(rng, n, exactly, from_s=learnt_s)
    return places.corridor_case(
        first + movers,
        until_s,
        seed=seed,
        learnt_s=learnt_s,
        sensor=sensor,
        nuisances=(sim.Lamps(), sim.Hum(level_db=15.0)),
    )


def _row(name: str, make: object, seeds: int = 2, **goals: float) -> Row:
    return Row(name=name, make=make, goals=Goals(**goals), seeds=seeds)  # type: ignore[arg-type]


ROWS = (
    _row("first ten passages of a new site", new_site, 4, recall=0.95, precision=0.97, direction=0.97),
    _row("single walkers, mono, peak SNR 20 dB and more", partial(singles, snr_db=(20.0, 30.0)), 3,
         recall=0.99, precision=0.99, direction=0.99, bias_percent=1.0, mae_percent=3.0),
    _row("single walkers, mono, peak SNR 14 dB", partial(singles, snr_db=(14.0, 14.0)),
         recall=0.97, precision=0.98, direction=0.97, mae_percent=4.0),
    _row("single walkers, mono, peak SNR 10 dB", partial(singles, snr_db=(10.0, 10.0)),
         recall=0.90, precision=0.98, direction=0.93, mae_percent=6.0),
    _row("single walkers, I/Q", partial(singles, channels=IQ, snr_db=(20.0, 30.0)),
         recall=0.99, precision=0.99, direction=0.998, mae_percent=3.0),
    _row("single walkers, I/Q off by 1.5 dB and 10 degrees, offset drifting",
         partial(singles, channels=IQ, snr_db=(20.0, 30.0), iq=IQ_ERROR),
         recall=0.99, precision=0.99, direction=0.998, mae_percent=3.0),
    _row("oblique, mono", partial(oblique, channels=MONO), 3,
         recall=0.98, precision=0.98, direction=0.96, bias_percent=2.0),
    _row("oblique, I/Q", partial(oblique, channels=IQ), 3,
         recall=0.98, precision=0.98, direction=0.998, bias_percent=2.0),
    _row("two people crossing each other, mono", partial(opposing, channels=MONO),
         recall=0.93, precision=0.98, direction=0.93, mae_percent=5.0),
    _row("two people crossing each other, I/Q", partial(opposing, channels=IQ),
         recall=0.98, precision=0.98, direction=0.99, mae_percent=5.0),
    _row("followers at 1.0 s", partial(followers, headway_s=1.0),
         recall=0.75, precision=0.97, direction=0.97),
    _row("followers at 1.5 s", partial(followers, headway_s=1.5),
         recall=0.90, precision=0.97, direction=0.97),
    _row("followers at 2.5 s", partial(followers, headway_s=2.5),
         recall=0.97, precision=0.97, direction=0.97),
    _row("slow, 0.4 to 0.7 m/s", slow, 3, recall=0.95, precision=0.97, direction=0.96),
    _row("stop for 3 to 10 s and go on", stopping, 2, recall=0.95, precision=0.97, direction=0.96),
    _row("turn-backs, loiterers, fidgeting", not_passing, 2, counted_share=0.05),
    _row("runners, cyclists, trolleys among walkers", mixed, 2,
         recall=0.98, precision=0.98, direction=0.97, mae_percent=4.0),
    _row("walkers on the lamp line, 50 Hz", partial(on_the_lamp_line, mains_hz=50.0), 2,
         recall=0.97, precision=0.98, direction=0.97),
    _row("walkers on the lamp line, 60 Hz", partial(on_the_lamp_line, mains_hz=60.0), 2,
         recall=0.97, precision=0.98, direction=0.97),
)  # fmt: skip
