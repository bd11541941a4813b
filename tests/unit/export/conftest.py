"""Stores with an invented site: a fresh one, and one that tests of a file share since nobody writes to it."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from ginnel.store import Store, open_store, put_site
from ginnel.words import Site


def _opened(folder: Path) -> Store:
    store = open_store(f"sqlite:///{folder / 'ginnel.db'}", create=True)
    put_site(store, Site(name="Tannery annex", timezone="Europe/Dublin"))
    return store


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    with _opened(tmp_path) as opened:
        yield opened


@pytest.fixture(scope="module")
def shared_store(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    with _opened(tmp_path_factory.mktemp("shared")) as opened:
        yield opened
