"""What exactly: the passages of an hour, one by one."""

from __future__ import annotations

from dataclasses import dataclass

from ginnel import reports
from ginnel.reports import overview as about
from ginnel.reports.flow import flow as flow_of
from ginnel.reports.passages import PassageEntry
from ginnel.store import Store
from ginnel.times import from_us
from ginnel.web.view import Show, View
from ginnel.words import US_PER_S

#: More than so many rows are no reading matter; the files have them all.
MOST_SHOWN = 400


@dataclass(frozen=True, slots=True, kw_only=True)
class Hour:
    """One hour of the local clock and how many passed in it; None where nobody listened."""

    start_us: int
    end_us: int
    count: int | None
    is_shown: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Single:
    """Everything that the page shows."""

    view: View
    hours: tuple[Hour, ...]
    start_us: int
    end_us: int
    entries: tuple[PassageEntry, ...]
    with_uncounted: bool
    is_cut: bool  # there are more than are shown
    heard: tuple[about.Stretch, ...]

    @property
    def listened_s(self) -> float:
        """Seconds of the hour that were listened to."""
        return sum(one.ended_us - one.started_us for one in self.heard) / US_PER_S


def look(store: Store, view: View, hour: str | None, *, with_uncounted: bool) -> Single:
    """Ask for the passages of an hour of the view's first day.

    ``hour`` is the start of an hour as ``HH`` or, where the clock shows one twice, ``HH+1`` for the second;
    without it the last hour in which anybody passed.
    """
    day = view.shown_as(Show.DAY, view.first)
    edges_us = reports.cut(day.start_us, day.end_us, reports.Every.HOUR, view.zone)
    found = flow_of(store, view.sensor.name, edges_us)
    names = hour_names([int(edge) for edge in edges_us[:-1]], view)
    busy = [i for i in range(len(names)) if found.both[i] > 0]
    chosen = names.index(hour) if hour in names else busy[-1] if busy else 0
    start_us, end_us = int(edges_us[chosen]), int(edges_us[chosen + 1])
    entries: list[PassageEntry] = []
    for entry in reports.iter_entries(
        store, [view.sensor.name], start_us, end_us, with_uncounted=with_uncounted
    ):
        if len(entries) == MOST_SHOWN:
            break
        entries.append(entry)
    known = found.is_known
    return Single(
        view=day,
        hours=tuple(
            Hour(
                start_us=int(edges_us[i]),
                end_us=int(edges_us[i + 1]),
                count=int(found.both[i]) if known[i] else None,
                is_shown=i == chosen,
            )
            for i in range(len(names))
        ),
        start_us=start_us,
        end_us=end_us,
        entries=tuple(entries),
        with_uncounted=with_uncounted,
        is_cut=not with_uncounted and int(found.both[chosen]) > len(entries),
        heard=about.heard(store, view.sensor.name, start_us, end_us),
    )


def hour_names(starts_us: list[int], view: View) -> list[str]:
    """Name each hour of a day for the address: 00 to 23, and 01+1 for one that the clock shows again."""
    names: list[str] = []
    for start_us in starts_us:
        name = f"{from_us(start_us, view.zone):%H}"
        names.append(f"{name}+1" if name in names else name)
    return names
