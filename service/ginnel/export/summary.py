"""One page about a sensor and a period: a table, two charts, coverage, method and cautions.

Here is what the page says; `summary_html` and `summary_pdf` print it.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import timedelta

from ginnel import reports
from ginnel.errors import ExportError
from ginnel.export.bars import Bar, bar_chart
from ginnel.export.descriptor import METHOD
from ginnel.export.tables import Question
from ginnel.reports import Every
from ginnel.reports.counts import WHOLE
from ginnel.reports.flow import Flow, total
from ginnel.reports.overview import extent_us
from ginnel.reports.speed_profile import speed_profiles
from ginnel.store import Store
from ginnel.times import from_us
from ginnel.words import US_PER_S, Direction, Sensor

_LEAST_COVERAGE = 0.95  # below, the page warns; a choice
_MOST_UNKNOWN = 0.05  # share of passages without a direction; likewise
_MOST_BARS = 62  # days, else weeks, else months
_CAUTIONS = (
    "People side by side are one to a radar; a crowd is undercounted. A tally by hand for an hour tells "
    "by how much: compare before you rely on totals.",
    "Limits are those of counting alone. They do not hold what the sensor misses, nor how days differ.",
    "Not for life safety, and not for enforcement.",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Chart:
    """A drawing with what it shows."""

    title: str
    caption: str
    svg: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Summary:
    """What one page says."""

    title: str
    period: str
    facts: tuple[tuple[str, str], ...]  # what, how much
    charts: tuple[Chart, ...]
    method: tuple[str, ...]
    cautions: tuple[str, ...]


def summaries(store: Store, asked: Question) -> tuple[Summary, ...]:
    """Summarise each sensor asked for, over the whole local days of the time asked for.

    Raises
    ------
    ExportError
        There is nothing in the log to tell of.
    """
    pages = [
        page
        for facts in reports.sensor_facts(store, asked.sensors)
        if (page := _summary(store, asked, facts.sensor, facts.chain_versions)) is not None
    ]
    if not pages:
        raise ExportError("there is nothing in the log to summarise yet: replay or listen first")
    return tuple(pages)


def _summary(store: Store, asked: Question, sensor: Sensor, versions: tuple[str, ...]) -> Summary | None:
    extent = extent_us(store, sensor.name)
    if extent is None:
        return None
    zone = reports.zone(store)
    start_us = extent[0] if asked.start_us is None else asked.start_us
    end_us = extent[1] if asked.end_us is None else asked.end_us
    day_edges = reports.cut(start_us, end_us, Every.DAY, zone)
    if len(day_edges) < 2:
        return None
    start_us, end_us = int(day_edges[0]), int(day_edges[-1])
    first, last = from_us(start_us, zone).date(), (from_us(end_us, zone) - timedelta(microseconds=1)).date()
    days = reports.flow(store, sensor.name, day_edges)
    mounting = sensor.mounting
    return Summary(
        title=f"{reports.site(store).name}: {sensor.name}",
        period=f"{first} to {last}, {len(day_edges) - 1} days, times by the clock of {zone}",
        facts=_facts(store, sensor, days, start_us, end_us),
        charts=(
            _average_day(store, sensor, start_us, end_us),
            _course(store, sensor, start_us, end_us),
        ),
        method=(
            METHOD["passages"],
            f"Percentiles: {METHOD['percentiles']}. {METHOD['coverage']}",
            f"Sensor: {sensor.carrier_hz / 1e9:g} GHz, {sensor.channels.value}, {mounting.aspect.value}, "
            f"{mounting.height_m:g} m high, {mounting.tilt_deg:g} degrees down. "
            f"Chain {', '.join(versions) or 'unknown'}.",
        ),
        cautions=(*_own_cautions(days), *_CAUTIONS),
    )


def _facts(
    store: Store, sensor: Sensor, days: Flow, start_us: int, end_us: int
) -> tuple[tuple[str, str], ...]:
    zone = reports.zone(store)
    whole = total(days)
    volumes = reports.volumes(store, sensor.name, start_us, end_us, zone)
    peak = reports.busiest(reports.daily_peaks(store, sensor.name, start_us, end_us, zone))
    *_, together = speed_profiles(store, sensor.name, start_us, end_us, bin_mps=0.1, pace_width_mps=0.5)
    speeds = together.summary
    names = {
        Direction.APPROACHING: sensor.approaching_name,
        Direction.RECEDING: sensor.receding_name,
        Direction.UNKNOWN: "direction unknown",
    }
    facts = [
        ("Listened", f"{whole.listened_s / 3600:.1f} h, {_percent(whole.coverage)} of the time"),
        (
            "Passages counted",
            f"{_whole(whole.both)} (95 % limits {_whole(whole.low)} to {_whole(whole.high)})",
        ),
        *((f"  {names[way]}", _whole(count)) for way, count in whole.counts.items()),
    ]
    if (average := volumes.average) is not None:
        limits = "" if average.low is None else f" ({_whole(average.low)} to {_whole(average.high)})"
        facts.append(("Average day", f"{_whole(average.mean)}{limits}, from {volumes.days} days"))
    if volumes.busiest is not None:
        facts.append(("Busiest day", f"{volumes.busiest.day}: {_whole(volumes.busiest.count)}"))
    if peak is not None:
        begin = from_us(peak.start_us, zone)
        facts.append(("Peak hour", f"{begin:%Y-%m-%d %H:%M}: {_whole(peak.volume)}"))
    if speeds.n:
        facts.append(
            (
                "Speed",
                f"mean {speeds.mean_mps:.2f} m/s, half below {speeds.p50_mps:.2f}, "
                f"85 % below {speeds.p85_mps:.2f}",
            )
        )
    return tuple(facts)


def _average_day(store: Store, sensor: Sensor, start_us: int, end_us: int) -> Chart:
    hours = reports.average_day(store, sensor.name, start_us, end_us, reports.zone(store))
    return Chart(
        title="The average day",
        caption="Passages an hour, by the hour that the clock shows; pale: never listened to enough.",
        svg=bar_chart(
            [Bar(label=f"{one.hour:02d}", value=None if one.mean is None else one.mean.mean) for one in hours]
        ),
    )


def _course(store: Store, sensor: Sensor, start_us: int, end_us: int) -> Chart:
    zone = reports.zone(store)
    n_days = (end_us - start_us) / (86_400 * US_PER_S)
    every = Every.DAY if n_days <= _MOST_BARS else Every.WEEK if n_days <= 7 * _MOST_BARS else Every.MONTH
    course = reports.flow(store, sensor.name, reports.cut(start_us, end_us, every, zone))
    starts = [from_us(int(us), zone) for us in course.edges_us[:-1]]
    each = max(len(starts) // 10, 1)
    form = "%Y-%m" if every is Every.MONTH else "%m-%d"
    bars = [
        Bar(
            label=f"{start:{form}}" if place % each == 0 else "",
            value=float(count) if known else None,
            is_partial=bool(share < WHOLE),
        )
        for place, (start, count, known, share) in enumerate(
            zip(starts, course.both, course.is_known, course.coverage, strict=True)
        )
    ]
    return Chart(
        title=f"Passages by {every.value}",
        caption="As counted; lighter: only a part was listened to; pale: nobody listened, which is not zero.",
        svg=bar_chart(bars),
    )


def _own_cautions(days: Flow) -> list[str]:
    whole = total(days)
    found = []
    if whole.coverage < _LEAST_COVERAGE:
        found.append(
            f"{_percent(1 - whole.coverage)} of the time was not listened to; the count is that of the rest."
        )
    unknown = whole.counts.get(Direction.UNKNOWN) or 0
    if whole.both and unknown > _MOST_UNKNOWN * whole.both:
        found.append(f"The direction of {_percent(unknown / whole.both)} of the passages is unknown.")
    return found


def _whole(value: float | None) -> str:
    return "unknown" if value is None else f"{value:,.0f}".replace(",", "\N{NO-BREAK SPACE}")


def _percent(share: float) -> str:
    return f"{100 * share:.1f} %"
