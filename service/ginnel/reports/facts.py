"""What the log knows of the site and its sensors, for whoever must judge the numbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from ginnel import store as log
from ginnel.errors import StoreError
from ginnel.store import Store
from ginnel.words import Mounting, Sensor, Site


@dataclass(frozen=True, slots=True, kw_only=True)
class SensorFacts:
    """A sensor with every mounting and version of the chain that its log was made with."""

    sensor: Sensor
    mountings: tuple[Mounting, ...]
    chain_versions: tuple[str, ...]


def site(store: Store) -> Site:
    """Get the site; an unnamed one in UTC while nobody has set it."""
    return log.site(store) or Site(name="Unnamed site")


def sensor_facts(store: Store, sensors: Sequence[str] | None = None) -> tuple[SensorFacts, ...]:
    """Tell of the sensors asked for, or of all, in order of name.

    Raises
    ------
    StoreError
        The store does not know one of them.
    """
    known = {sensor.name: sensor for sensor in log.sensors(store)}
    if unknown := sorted(set(sensors or ()) - known.keys()):
        names = ", ".join(known) or "none yet"
        raise StoreError(f"the store knows no sensor {unknown[0]!r}; it knows: {names}")
    heard = log.spans(store)
    facts = []
    for sensor in known.values():
        if sensors is not None and sensor.name not in sensors:
            continue
        own = [span for span in heard if span.sensor == sensor.name]
        facts.append(
            SensorFacts(
                sensor=sensor,
                mountings=tuple(dict.fromkeys(span.mounting for span in own)) or (sensor.mounting,),
                chain_versions=tuple(sorted({span.chain_version for span in own})),
            )
        )
    return tuple(facts)
