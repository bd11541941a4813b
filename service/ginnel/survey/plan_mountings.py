"""Which of a few ordinary mountings suits a path best."""

from __future__ import annotations

from dataclasses import dataclass, replace

from ginnel.doppler.kinematics import BODY_CENTRE_M
from ginnel.survey.plan import Lane, Plan, make_plan
from ginnel.words import Aspect, Mounting

#: Beyond this a mover on the loud side hides one on the other: the chain takes 2 % of a frame's strongest
#: cell (`passages.cluster`) as that mover's own limbs.
UNEVEN_DB = 17.0
_BESIDE_M = 0.5  # from the edge of the path
_ANGLES_DEG = (15.0, 30.0, 45.0)
_OVER_ROAD_M = 5.5  # lowest thing over a road; common practice, no source


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """One mounting and what it is worth for the movers expected."""

    name: str
    mounting: Mounting
    lanes: tuple[Lane, ...]  # near edge, middle, far edge

    @property
    def is_countable(self) -> bool:
        """Whether movers count at both edges of the path."""
        return all(lane.is_countable for lane in self.lanes)

    @property
    def farthest_m(self) -> float:
        """Largest nearest distance: how far a crossing is spread along the path."""
        return max(lane.nearest_m for lane in self.lanes)

    @property
    def unevenness_db(self) -> float:
        """How much louder a mover on the loudest line is than on the faintest."""
        peaks = [lane.peak_dbm for lane in self.lanes]
        return max(peaks) - min(peaks)

    @property
    def is_even(self) -> bool:
        """Whether the two sides of the path are heard alike enough not to hide each other."""
        return self.unevenness_db <= UNEVEN_DB

    @property
    def bias_ratio(self) -> float | None:
        """Mean cosine bias of the radial speed along the middle; None where nothing is heard."""
        return self.lanes[1].mean_bias_ratio


def choices(plan: Plan) -> tuple[Choice, ...]:
    """Return the planned mounting and its rivals, best first.

    Those that count over the whole width come first, before them those that hear both sides alike; among
    equals the one whose crossings are spread least along the path, since followers nearer than that run
    together, then the one with the least cosine bias. A rule of thumb; common practice, no source.
    """
    found = [_choice(plan, name, mounting) for name, mounting in _candidates(plan).items()]
    return tuple(sorted(found, key=_rank))


def _rank(choice: Choice) -> tuple[bool, bool, float, float]:
    """Place among rivals, the smallest first."""
    bias_ratio = -1.0 if choice.bias_ratio is None else choice.bias_ratio
    return not choice.is_countable, not choice.is_even, round(choice.farthest_m, 1), -bias_ratio


def _candidates(plan: Plan) -> dict[str, Mounting]:
    """Name some mountings that can be had with the same module."""
    planned = plan.sensor.mounting
    vehicles = plan.expected.name == "car"
    beside = replace(
        planned,
        aspect=Aspect.AXIAL,
        offset_m=plan.path_width_m / 2 + _BESIDE_M,
        beam_angle_deg=0.0,
    )
    over = replace(
        beside,
        offset_m=0.0,
        height_m=max(planned.height_m, _OVER_ROAD_M if vehicles else 2 * BODY_CENTRE_M + 0.2),
        tilt_deg=max(planned.tilt_deg, 15.0),
    )
    found = {
        "as planned": planned,
        f"over the middle, {over.height_m:g} m up, along the path": over,
        "beside the path, along it": beside,
    }
    for angle_deg in _ANGLES_DEG:
        found[f"beside the path, turned by {angle_deg:g} degrees"] = replace(
            beside, aspect=Aspect.OBLIQUE, beam_angle_deg=angle_deg
        )
    return found


def _choice(plan: Plan, name: str, mounting: Mounting) -> Choice:
    rival = make_plan(
        replace(plan.sensor, mounting=mounting),
        plan.module,
        path_width_m=plan.path_width_m,
        sample_rate_hz=plan.sample_rate_hz,
    )
    return Choice(name=name, mounting=mounting, lanes=rival.lanes_of(plan.expected))
