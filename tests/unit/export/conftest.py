"""A store with an invented site."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from ginnel.store import Store, open_store, put_site
from ginnel.words import Site


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    with open_store(f"sqlite:///{tmp_path / 'ginnel.db'}", create=True) as opened:
        put_site(opened, Site(name="Tannery annex", timezone="Europe/Dublin"))
        yield opened
