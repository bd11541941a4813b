"""The pedestrian counts through the command that imports counts, as their owner would type it."""

from __future__ import annotations

from pathlib import Path
from zoneinfo import ZoneInfo

import pandas as pd
import pytest
from click.testing import CliRunner

from ginnel.cli import main
from ginnel.errors import StoreError
from ginnel.reports import Every, cut, series_flow, volumes_of
from ginnel.store import Store, open_store, put_site
from ginnel.times import to_us
from ginnel.words import Site

BUSIEST = "45 Queen Street"


def imported(folder: Path, table: pd.DataFrame, zone: str) -> tuple[Store, str]:
    """The store and what was said, after an import of one year."""
    url = f"sqlite:///{folder / 'ginnel.db'}"
    with open_store(url, create=True) as store:
        put_site(store, Site(name="Ferry Street", timezone=zone))
    (folder / "ginnel.toml").write_text(f'[site]\ntimezone = "{zone}"\n[store]\nurl = "{url}"\n', "utf-8")
    table[["date", "hour", BUSIEST]].to_csv(folder / "counts.csv", index=False, date_format="%Y-%m-%d")
    words = f"store import-counts {folder / 'counts.csv'} --config {folder / 'ginnel.toml'} --series old"
    asked = [*words.split(), "--time", "date", "--hour", "hour", "--count", f"{BUSIEST}=approaching"]
    said = CliRunner().invoke(main, asked)
    return open_store(url), said.output


def test_volumes_of_the_imported_series_are_the_published_ones(
    pedestrians: pd.DataFrame, tmp_path: Path
) -> None:
    """Days as the labels have them, by a clock that does not change, which is how the facts were reckoned."""
    store, said = imported(tmp_path, pedestrians[pedestrians["year"] == 2019], "UTC")
    assert "old: 8760 counts" in said
    assert "days begin at 6:00" in said
    zone = ZoneInfo("UTC")
    start, end = (to_us(pd.Timestamp(day, tz="UTC").to_pydatetime()) for day in ("2019-01-01", "2020-01-01"))
    with store:
        found = volumes_of(series_flow(store, "old", cut(start, end, Every.HOUR, zone)), zone)
        with pytest.raises(StoreError, match="ask for longer ones"):
            series_flow(store, "old", cut(start, end, Every.QUARTER_HOUR, zone))
    assert found.days == 365
    assert found.aadt.value == pytest.approx(26_773.7375, abs=5e-5)
    assert found.design_hours[1].k == pytest.approx(0.12699, abs=5e-6)


def test_faults_are_told_at_the_door(pedestrians: pd.DataFrame, tmp_path: Path) -> None:
    store, said = imported(tmp_path, pedestrians[pedestrians["year"] == 2023], "Pacific/Auckland")
    store.close()
    assert "2023-09-24 02:00, skipped hour has a row: " in said
    assert "what came at 12 comes at 11" in said
    assert "2023-04-02 02:00, repeated hour has one row: " in said
