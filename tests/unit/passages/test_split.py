"""Followers: one fitted mover is told from two of the same cells.

Cells are drawn from the model of the fit: exponential, mean 1 + P (Itakura and Saito's form of the
likelihood, from memory). The whole chain is held against simulated walkers in tests/accuracy.
"""

from __future__ import annotations

import numpy as np
import pytest
from tests.unit.passages.test_fit import SITES, cluster_of, mover_of

from ginnel.passages.explain import explain
from ginnel.passages.split import tales_of
from ginnel.words import Channels


@pytest.mark.parametrize(
    ("channels", "sign", "headway_s"),
    [(Channels.IQ, 1, 1.6), (Channels.IQ, 1, 2.5), (Channels.IQ, -1, 2.5), (Channels.MONO, -1, 3.5)],
)
def test_followers_at_one_speed_are_two(channels: Channels, sign: int, headway_s: float) -> None:
    movers = [mover_of(35.0, sign=sign, crossed_s=at) for at in (11.0, 11.0 + headway_s)]
    found = explain(cluster_of(SITES[channels], movers, seed=1))
    assert [one.mover.sign for one in found] == [sign, sign]
    for one, truth in zip(found, movers, strict=True):
        assert one.mover.crossed_s == pytest.approx(truth.crossed_s, abs=0.4)


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("seed", range(4))
def test_one_alone_stays_one(channels: Channels, seed: int) -> None:
    cluster = cluster_of(SITES[channels], [mover_of(sign=1 - 2 * (seed % 2))], seed)
    (one,) = explain(cluster)
    single, pair = tales_of(cluster, one)
    assert pair.score - single.score < 75.0


def test_telling_leaves_the_cluster_as_it_was() -> None:
    cluster = cluster_of(SITES[Channels.MONO], [mover_of()], seed=3)
    (one,) = explain(cluster)
    before = cluster.whitened.copy()
    tales_of(cluster, one)
    np.testing.assert_allclose(cluster.whitened, before, rtol=1e-9)
