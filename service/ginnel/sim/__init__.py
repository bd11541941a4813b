"""Captures with known truth.

In: a sensor, movers, nuisances, a seed. Out: samples (or files) and the truth about who passed.
May know the words and the formulas of `doppler.kinematics`, nothing else of Ginnel: a simulator
that shared code with the chain would share its mistakes.
"""

from ginnel.sim.arrivals import WALKING_SPEED_MPS, poisson_walkers
from ginnel.sim.bodies import BUS, CAR, MOTORCYCLE, VAN, Cyclist, Trolley, Vehicle, Walker
from ginnel.sim.files import capture_name, write_sigmf, write_truth, write_wav
from ginnel.sim.motion import Path, constant_speed, loiter, meandering, sampled, stop_and_go, turn_back
from ginnel.sim.movers import (
    Mover,
    TrueMover,
    cyclist,
    follow,
    loiterer,
    runner,
    stopper,
    trolley,
    turner,
    vehicle,
    walker,
)
from ginnel.sim.nuisance import Clicks, Clutter, Door, Fan, Hum, Lamps, Nuisance, leaves, rain
from ginnel.sim.receiver import IqError, Receiver
from ginnel.sim.scene import Scene
from ginnel.sim.sensor import Beam, Floor, Mirror, Wall

__all__ = [
    "BUS",
    "CAR",
    "MOTORCYCLE",
    "VAN",
    "WALKING_SPEED_MPS",
    "Beam",
    "Clicks",
    "Clutter",
    "Cyclist",
    "Door",
    "Fan",
    "Floor",
    "Hum",
    "IqError",
    "Lamps",
    "Mirror",
    "Mover",
    "Nuisance",
    "Path",
    "Receiver",
    "Scene",
    "Trolley",
    "TrueMover",
    "Vehicle",
    "Walker",
    "Wall",
    "capture_name",
    "constant_speed",
    "cyclist",
    "follow",
    "leaves",
    "loiter",
    "loiterer",
    "meandering",
    "poisson_walkers",
    "rain",
    "runner",
    "sampled",
    "stop_and_go",
    "stopper",
    "trolley",
    "turn_back",
    "turner",
    "vehicle",
    "walker",
    "write_sigmf",
    "write_truth",
    "write_wav",
]
