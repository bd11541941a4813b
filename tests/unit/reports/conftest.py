"""A store with an invented site; its tables are made once and copied, which is quicker."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

from ginnel.store import Store, open_store, put_site
from ginnel.words import Site


@pytest.fixture(scope="session")
def empty_store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("empty") / "ginnel.db"
    with open_store(f"sqlite:///{path}", create=True) as opened:
        put_site(opened, Site(name="Tannery annex", timezone="Europe/Dublin"))
    return path


@pytest.fixture
def store(tmp_path: Path, empty_store: Path) -> Iterator[Store]:
    copy = shutil.copy(empty_store, tmp_path / "ginnel.db")
    with open_store(f"sqlite:///{copy}") as opened:
        yield opened
