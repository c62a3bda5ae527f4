"""Characteristic functions of tilted sums: interpolation, and what may be left out."""

import numpy as np
import pytest

from loadsum.demand.spectrum import _chebyshev, spectrum
from loadsum.demand.tilting import EPS, endwise, moments, saddlepoint, tilted, window
from tests.demand.exactsum import sparse


def terms_of(customers, seed=0):
    rng = np.random.default_rng(seed)
    masses = []
    for _ in range(customers):
        row = np.bincount(np.rint(rng.lognormal(3.5, 0.7, 90)).astype(int)).astype(float)
        masses.append(row / row.sum())
    return endwise(masses, [1] * customers)


@pytest.mark.parametrize(("steps", "points"), [(64, 16), (640, 40), (1024, 96)])
def test_interpolation_reproduces_constants_and_phases_to_rounding_error(steps, points):
    gather, places = _chebyshev(steps, points)
    assert np.abs(gather.sum(axis=1) - 1.0).max() <= 4.0 * EPS
    turn = 4.0 * points / np.e * np.exp(-40.0 / points)  # radians over the row, as many as so many points resolve
    exact = np.exp(1j * turn * np.arange(steps) / (steps - 1))
    found = gather @ np.exp(1j * turn * places / (steps - 1))
    assert np.abs(found - exact).max() <= (20.0 + 2.0 * turn) * EPS


def direct(at, nodes, length):
    values = np.ones(nodes.size, dtype=complex)
    for block in at.blocks:
        phase = np.exp(-2j * np.pi / length * np.outer(np.arange(block.mass.shape[2]), nodes))
        for row, count in zip(block.mass[0], block.counts[0], strict=True):
            values *= (row @ phase) ** int(count)
    return values


@pytest.mark.parametrize(
    "terms",
    [
        terms_of(3),
        terms_of(40),
        endwise([np.array(sparse({0: 1, 40: 2, 80: 1})) / 4.0, np.array([0.5, 0.5])], [30, 1]),
    ],
    ids=["few customers", "many customers", "a comb"],
)
def test_what_is_kept_agrees_with_the_definition_and_what_is_left_out_is_negligible(terms):
    target = moments(terms, np.zeros(1))[0] * 0.7
    at = tilted(terms, saddlepoint(terms, target))
    first, last = window(terms, at, np.array([1e-16]))
    length, negligible = int(last[0] - first[0]) + 1, 1e-17
    law = spectrum(terms, at, length, negligible)
    every = np.arange(length // 2 + 1)
    truth = direct(at, every, length)
    assert np.all(np.abs(law.values[0] - truth[law.nodes]) <= law.noise[0] + 1e-13 * np.abs(truth[law.nodes]) + 1e-15)
    left_out = np.setdiff1d(every, law.nodes)
    assert np.abs(truth[left_out]).max(initial=0.0) <= 1e-15  # the definition itself is summed with rounding error
    if at.blocks[0].counts.sum() == 40:
        assert law.nodes.size < length // 40


def test_the_window_holds_all_but_the_tolerance_of_the_tilted_law():
    terms = terms_of(5)
    at = tilted(terms, saddlepoint(terms, np.array([120.0])))
    first, last = window(terms, at, np.array([1e-6]))
    law = np.ones(1)
    for row in at.blocks[0].mass[0]:
        law = np.convolve(law, row)
    assert law[: int(first[0])].sum() <= 1e-6
    assert law[int(last[0]) + 1 :].sum() <= 1e-6
    assert int(last[0]) - int(first[0]) < law.size - 1


def test_the_saddlepoint_puts_the_level_in_the_middle():
    terms = terms_of(20)
    mean = float(moments(terms, np.zeros(1))[0][0])
    for target in (0.2 * mean, 0.6 * mean, 0.95 * mean):
        theta = saddlepoint(terms, np.array([target]))
        middle, variance = moments(terms, theta)
        assert abs(float(middle[0]) - target) <= 0.3 * float(np.sqrt(variance[0])) + 1e-3 * target
    assert saddlepoint(terms, np.array([1.1 * mean])) == 0.0
