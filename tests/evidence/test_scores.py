"""Scores and coverage tests against published values and values computed from published formulas.

Each value stands with its citation and provenance in tests/reference/calibration.json.
"""

import json
from pathlib import Path

import numpy as np
import pytest

from loadsum.demand.lattice import lattice_mass
from loadsum.evidence.coverage import chance_range, christoffersen, effective_count, kupiec
from loadsum.evidence.scores import brier, crps_lattice, crps_normal, crps_sample, pinball, randomised_pit

VALUES = {
    value["id"]: value
    for value in json.loads((Path(__file__).parents[1] / "reference" / "calibration.json").read_text("utf-8"))["values"]
}


def _fields(text: str) -> dict[str, float]:
    return {part.split("=")[0]: float(part.split("=")[1]) for part in text.split(",")}


@pytest.mark.parametrize(("case", "expected"), VALUES["kupiec_LR"]["expected"].items())
def test_the_kupiec_ratio_agrees_with_its_formula(case: str, expected: float) -> None:
    given = _fields(case)
    assert kupiec(int(given["T"]), int(given["x"]), given["p"]) == pytest.approx(expected, abs=5e-8)


@pytest.mark.parametrize(("case", "expected"), VALUES["kupiec_regions"]["expected"].items())
def test_the_kupiec_test_accepts_the_tabulated_numbers_of_passes(case: str, expected: list[int]) -> None:
    share, count = float(case.split(",")[0].split("=")[1]), int(case.split("T=")[1])
    accepted = [x for x in range(count // 2) if kupiec(count, x, share) < 3.8415]
    assert [accepted[0], accepted[-1]] == expected


def test_the_christoffersen_example() -> None:
    expected = VALUES["christoffersen"]["expected"]
    found = christoffersen(expected["T00"], expected["T01"], expected["T10"], expected["T11"], expected["p"])
    assert found.share == pytest.approx(expected["LRuc"], abs=1e-7)
    assert found.independence == pytest.approx(expected["LRind"], abs=1e-7)
    assert found.both == pytest.approx(expected["LRcc"], abs=1e-7)


@pytest.mark.parametrize(
    ("mean", "spread", "observed", "case"),
    [
        (0, 1, 0, "N(0,1),y=0"),
        (0, 1, 1, "N(0,1),y=1"),
        (0, 1, 2, "N(0,1),y=2"),
        (0, 1, -1, "N(0,1),y=-1"),
        (30, 4, 38, "N(30,4),y=38"),
    ],
)
def test_the_ranked_probability_score_of_a_normal_law(mean: float, spread: float, observed: float, case: str) -> None:
    found = crps_normal(np.array([float(mean)]), np.array([float(spread)]), np.array([float(observed)]))[0]
    assert found == pytest.approx(float(VALUES["crps"]["expected"][case]), abs=1e-11)


def test_the_ranked_probability_score_of_three_members() -> None:
    members, observed = np.array([1.0, 2.0, 4.0]), np.array([3.0])
    expected = VALUES["crps"]["expected"]["emp"]
    assert crps_sample(members, observed)[0] == pytest.approx(expected, abs=1e-12)
    assert crps_lattice(lattice_mass(members, 0.5, "exact"), observed)[0] == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize("observed", [-1.0, 0.0, 0.3, 2.2, 7.0, 9.0])
def test_the_lattice_score_is_the_integral_it_stands_for(observed: float) -> None:
    law = lattice_mass(np.array([0.0, 1.0, 1.0, 2.5, 7.0]), 0.5, "exact")
    grid = np.linspace(-3.0, 12.0, 1_500_001)
    at_most = 1.0 - law.above_many(grid)
    integral = np.trapezoid((at_most - (grid >= observed)) ** 2, grid)
    assert crps_lattice(law, np.array([observed]))[0] == pytest.approx(integral, abs=2e-5)


@pytest.mark.parametrize(
    ("share", "level", "observed", "case"),
    [(0.95, 10, 12, "tau=.95,q=10,y=12"), (0.95, 10, 8, "tau=.95,q=10,y=8"), (0.5, 10, 12, "tau=.5,q=10,y=12")],
)
def test_pinball_loss(share: float, level: float, observed: float, case: str) -> None:
    found = pinball(np.array([float(level)]), np.array([float(observed)]), share)[0]
    assert found == pytest.approx(VALUES["pinball"]["expected"][case], abs=1e-12)


def test_the_brier_score_and_its_parts() -> None:
    expected = VALUES["brier"]["expected"]
    found = brier(np.array(expected["f"]), np.array(expected["y"], dtype=float))
    assert found.score == pytest.approx(expected["BS"], abs=1e-12)
    assert found.reliability == pytest.approx(expected["REL"], abs=1e-12)
    assert found.resolution == pytest.approx(expected["RES"], abs=1e-12)
    assert found.uncertainty == pytest.approx(expected["UNC"], abs=1e-12)


def test_the_transform_of_a_right_law_is_uniform() -> None:
    rng = np.random.default_rng(1)
    law = lattice_mass(np.array([0.0, 1.0, 1.0, 3.0]), 1.0, "exact")
    drawn = rng.choice([0.0, 1.0, 1.0, 3.0], 20_000)
    counts = np.histogram(randomised_pit(law, drawn, rng), 10, (0.0, 1.0))[0]
    assert counts == pytest.approx(np.full(10, 2000), abs=200)


def test_independent_weeks_are_worth_all_their_intervals_and_clustered_ones_less() -> None:
    rng = np.random.default_rng(2)
    intervals = np.full(500, 168.0)
    spread = effective_count(rng.binomial(168, 0.01, 500).astype(float), intervals, 0.01)
    clustered = effective_count(np.where(rng.random(500) < 0.05, 33.6, 0.0), intervals, 0.01)
    assert spread > 0.8 * intervals.sum()
    assert clustered < 0.1 * intervals.sum()


@pytest.mark.parametrize(("weeks", "clustered"), [(12, False), (12, True), (52, True)])
def test_the_range_that_chance_allows_holds_the_share_in_about_95_of_100_records(weeks: int, clustered: bool) -> None:
    rng = np.random.default_rng(21)
    intervals = np.full(weeks, 336.0)
    inside = 0
    for _ in range(400):
        # a week's share is 10 % on average; where demand clusters it moves from week to week
        rate = rng.beta(4.0, 36.0, weeks) if clustered else np.full(weeks, 0.1)
        passes = rng.binomial(336, rate).astype(float)
        low, high = chance_range(effective_count(passes, intervals, 0.1), 0.1, weeks)
        inside += low <= passes.sum() / intervals.sum() <= high
    print(f"{weeks} weeks, clustered {clustered}: {inside / 4:.1f} of 100 records inside")
    assert 0.91 < inside / 400 <= 0.99
