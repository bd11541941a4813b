"""Level of service of a walkway: how freely people walk there.

All limits: Highway Capacity Manual, 7th edition, exhibits 24-1 (random flow) and 24-2 (platoons), given there
in square feet and feet; converted exactly.
"""

from __future__ import annotations

from enum import StrEnum

FOOT_M = 0.3048


class Level(StrEnum):
    """Levels of service, A (free) to F (jammed)."""

    A = "A"
    B = "B"
    C = "C"
    D = "D"
    E = "E"
    F = "F"


#: Space per person above which a level holds, ft^2.
_RANDOM_FT2 = ((Level.A, 60), (Level.B, 40), (Level.C, 24), (Level.D, 15), (Level.E, 8))
_PLATOON_FT2 = ((Level.A, 530), (Level.B, 90), (Level.C, 40), (Level.D, 23), (Level.E, 11))


def unit_flow(quarter_count: float, width_m: float) -> float:
    """Persons per minute and metre of effective width, from the busiest quarter hour.

    Notes
    -----
    v = v15 / (15 W). Source: HCM 7th edition, chapter 24. 100 on 5 ft are 1.33 per minute and foot.
    """
    if not width_m > 0:
        raise ValueError(f"{width_m=} must be positive")
    return quarter_count / (15 * width_m)


def space_m2(speed_mps: float, flow_per_min_m: float) -> float:
    """Square metres for each person: speed over flow; infinite where nobody walks.

    Notes
    -----
    A = S / v. Source: HCM 7th edition, chapter 24. 240 ft/min at 1.33 per minute and foot are 180 ft^2.
    """
    return speed_mps * 60 / flow_per_min_m if flow_per_min_m > 0 else float("inf")


def level_of_service(space_m2: float, *, platoons: bool = False) -> Level:
    """Level for a space per person; people in platoons need more of it."""
    limits = _PLATOON_FT2 if platoons else _RANDOM_FT2
    return next((level for level, least in limits if space_m2 > least * FOOT_M**2), Level.F)
