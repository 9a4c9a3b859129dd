"""Donors that stand in for silent ones, found once for every set that occurs."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from leave_one_out_data import small_network

from basinrain.infill import InfillOptions
from basinrain.infill.substitutes import Substitutes

Bools = npt.NDArray[np.bool_]


class Asked:
    """The two nearest gauges donate; sets of gauges that were asked for are counted."""

    def __init__(self, n: int) -> None:
        self.network, self.options, self.sets = small_network(n), InfillOptions(nearest=2, min_donors=1), 0

    def weights(self, target: int, reporting: Bools, /) -> npt.NDArray[np.float64]:
        """Return the weights, and count."""
        self.sets += len(reporting)
        return self.options.weights(self.network, target, reporting)

    def substitutes(self) -> Substitutes:
        """Return what is to be tested."""
        return Substitutes(np.ones(len(self.network), dtype=bool), self.weights)


def test_each_set_of_silent_donors_is_asked_for_once() -> None:
    """Steps that differ only in gauges that do not matter share an answer, and a second look asks for nothing."""
    asked = Asked(9)
    found = asked.substitutes()
    assert (asked.sets, found.base.shape, asked.sets) == (0, (9, 9), 9)
    # Gauge 0's order: the donor, then who steps in one after the other.
    order = [int(g) for g in asked.network.nearest_first(asked.network.distances()[0])[1:]]
    silent = np.zeros((4, 9), dtype=bool)
    silent[:, order[0]] = True
    silent[1, order[4]] = silent[2, order[5]] = silent[3, order[2]] = True
    pairs = found.of(silent)
    assert pairs is not None
    first, same, also, other = pairs.node[pairs.target == 0]
    assert first == same == also != other
    before = asked.sets
    again = found.of(silent)
    assert again is not None
    assert np.array_equal(again.node, pairs.node)
    assert asked.sets == before


def test_donors_are_those_of_asking_for_the_very_step() -> None:
    """Whatever is silent, node weights are the weights by the whole row of gauges."""
    asked = Asked(9)
    found = asked.substitutes()
    silent = np.random.default_rng(1).random((400, 9)) < 0.12
    pairs = found.of(silent)
    assert pairs is not None
    assert len(pairs.row) > 500
    for row, target, node in zip(pairs.row, pairs.target, pairs.node, strict=True):
        others = ~silent[row]
        others[target] = False
        expected = asked.options.weights(asked.network, int(target), others)
        mine = np.zeros(9)
        donors, weights = found.donors(np.array([node]))
        np.add.at(mine, donors[0], weights[0])
        assert np.array_equal(mine, expected)
        assert found.estimable(np.array([node]))[0] == expected.any()


def test_pairs_left_out_need_no_other_donors() -> None:
    """Gauges that are not listed have all donors of the full network, or are silent themselves."""
    found = Asked(9).substitutes()
    silent = np.random.default_rng(2).random((300, 9)) < 0.1
    pairs = found.of(silent)
    assert pairs is not None
    needed = (silent[:, :, None] & (found.base != 0)[None]).any(axis=1) & ~silent
    listed = np.zeros_like(silent)
    listed[pairs.row, pairs.target] = True
    assert np.array_equal(listed, needed)


def test_where_most_need_other_donors_nothing_is_looked_for() -> None:
    """Where over half of gauges and rows need other donors, the answer is to ask row by row."""
    found = Asked(9).substitutes()
    rng = np.random.default_rng(4)
    answers = set()
    for share in np.linspace(0.05, 0.4, 60):
        silent = rng.random((3, 9)) < share
        needed = (silent[:, :, None] & (found.base != 0)[None]).any(axis=1) & ~silent
        assert (found.of(silent) is None) == (needed.sum() > 13)
        answers.add(bool(needed.sum() > 13))
    assert answers == {True, False}


def test_memory_of_sets_is_bounded() -> None:
    """Past the limit what was found is forgotten, and found again alike."""
    asked = Asked(9)
    found = Substitutes(np.ones(9, dtype=bool), asked.weights, most_bytes=5000)
    silent = np.random.default_rng(3).random((200, 9)) < 0.12
    first = found.of(silent)
    assert first is not None
    weights = found.donors(first.node)[1]
    before, size = asked.sets, len(found)
    assert size > 20
    assert found.n_bytes > 5000
    second = found.of(silent)
    assert second is not None
    assert asked.sets > before
    assert len(found) == size
    assert np.array_equal(found.donors(second.node)[1], weights)


def test_many_donors() -> None:
    """A gauge with over 32 donors is not taken apart."""
    network = small_network(40)
    options = InfillOptions(nearest="all")
    wide = Substitutes(np.ones(40, dtype=bool), lambda g, reporting: options.weights(network, g, reporting))
    assert wide.wide
    assert wide.base.shape == (40, 40)
    assert (np.diag(wide.base) == 0).all()


def test_a_method_that_breaks_its_promise_is_found_out() -> None:
    """Weights that spread to more donors when one goes silent are refused."""

    def faithless(target: int, reporting: Bools, /) -> npt.NDArray[np.float64]:
        alone = np.zeros(reporting.shape)
        alone[:, (target + 1) % 4] = 1.0
        everyone = reporting / np.maximum(reporting.sum(axis=1, keepdims=True), 1)
        return np.where(reporting[:, [(target + 1) % 4]], alone, everyone)

    found = Substitutes(np.ones(4, dtype=bool), faithless)
    with pytest.raises(RuntimeError, match="the method's weights do not keep their promise"):
        found.of(np.array([[False, True, False, False]]))
