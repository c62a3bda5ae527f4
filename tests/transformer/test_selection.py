"""The choice of rating: every outcome has its own sentence, and no verdict is given without a criterion."""

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock
from loadsum.study.unittables import AllowedLoading, Criterion
from loadsum.transformer.selection import Figure, evaluate

PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.05, resamples=0
)
RATINGS = (10.0, 15.0, 25.0)
HOURS = Criterion(quantity="exceedance hours per year", limit=8.0, of="nameplate", source="Loading rules, clause 4")
AGEING = Criterion(quantity="ageing per year", limit=1.0, source="Loading rules, clause 5")


def one_customer(*, winter_peak_kw: float = 12.0):
    """A block of 100 winter days, one in ten with a peak hour, and 265 quiet summer days."""
    winter, summer = np.ones((1, 100, 24)), np.ones((1, 100, 24))
    winter[0, :10, 18] = winter_peak_kw
    blocks = [
        DayBlock(season=name, day_type="all days", days_per_year=days, day=np.arange(100), kw=kw)
        for name, days, kw in (("winter", 100.0, winter), ("summer", 265.0, summer))
    ]
    return group_demand(blocks, interval_min=60, power_factor=1.0, settings=PLAIN)


DEMAND = one_customer()


def ageing_of(**figures):
    """A source of ageing figures by rating in kVA, named r10, r15, r25."""
    return {"ageing per year": lambda criterion, rating: figures[f"r{rating:g}"]}


def held(*figures, criterion=AGEING, **more):
    named = {f"r{rating:g}": figure for rating, figure in zip(RATINGS, figures, strict=True)}
    return evaluate(DEMAND, RATINGS, [criterion], [], others=ageing_of(**named), **more)


def test_the_smallest_rating_that_meets_the_criterion_is_chosen():
    found = evaluate(DEMAND, RATINGS, [HOURS], [])
    assert found.verdict == "chosen" and found.rating_kva == 15.0
    assert found.sentence == "15 kVA is the smallest rating compared that meets every criterion."
    rows = found.criteria[0].by_rating
    assert [row.value for row in rows] == pytest.approx([10.0, 0.0, 0.0], abs=1e-9)
    assert [row.margin for row in rows] == pytest.approx([-2.0, 8.0, 8.0])
    assert [row.outcome for row in rows] == ["not met", "met", "met"]


def test_allowed_loading_of_the_season_moves_the_choice():
    criterion = Criterion(quantity=HOURS.quantity, limit=8.0, source="x")
    allowed = [AllowedLoading(season="winter", normal_pu=1.25, source="x")]
    assert evaluate(DEMAND, RATINGS, [criterion], allowed).rating_kva == 10.0
    summer_only = [AllowedLoading(season="summer", normal_pu=1.25, source="x")]
    assert evaluate(DEMAND, RATINGS, [criterion], summer_only).rating_kva == 15.0


def test_an_emergency_loading_that_is_not_stated_is_not_made_up():
    criterion = Criterion(quantity=HOURS.quantity, limit=8.0, of="allowed loading, emergency", source="x")
    found = evaluate(DEMAND, RATINGS, [criterion], [AllowedLoading(season="winter", emergency_pu=1.5)])
    assert {row.outcome for row in found.criteria[0].by_rating} == {"cannot be evaluated"}
    assert "states no allowed loading, emergency" in found.criteria[0].by_rating[0].reason


def test_a_season_of_a_criterion_leaves_the_others_out():
    criterion = Criterion(quantity=HOURS.quantity, limit=0.001, of="nameplate", season="summer", source="x")
    assert evaluate(DEMAND, RATINGS, [criterion], []).rating_kva == 10.0


def test_without_a_criterion_there_is_no_verdict():
    found = evaluate(DEMAND, RATINGS, [], [])
    assert (found.verdict, found.rating_kva) == ("no criterion", None)
    assert found.sentence == "The study file states no criterion, so there is a table and no verdict."


def test_none_suffices_and_all_suffice_have_their_sentences():
    none = evaluate(one_customer(winter_peak_kw=90.0), RATINGS, [HOURS], [])
    assert none.sentence == "No rating up to 25 kVA meets every criterion."
    every = evaluate(one_customer(winter_peak_kw=2.0), RATINGS, [HOURS], [])
    assert every.sentence == "Every rating compared meets every criterion; 10 kVA is the smallest."


def test_a_limit_inside_the_interval_is_not_decided():
    unsure = Figure(value=0.9, low=0.5, high=1.4)
    found = held(Figure(value=3.0), unsure, Figure(value=0.1))
    assert found.criteria[0].by_rating[1].outcome == "not decided by these data"
    assert (found.rating_kva, found.undecided_kva) == (25.0, (15.0,))
    assert found.sentence.endswith("15 kVA is not decided by these data.")
    none_sure = held(Figure(value=3.0), unsure, unsure)
    assert none_sure.verdict == "not decided" and none_sure.rating_kva is None


def test_the_upper_end_counts_when_the_criterion_says_so():
    criterion = Criterion(quantity=AGEING.quantity, limit=1.0, statistic="upper end of interval", source="x")
    rows = held(
        Figure(value=0.9, low=0.5, high=1.4), Figure(value=0.9), Figure(value=0.2, low=0.1, high=1.0),
        criterion=criterion,
    ).criteria[0].by_rating  # fmt: skip
    assert [row.outcome for row in rows] == ["not met", "cannot be evaluated", "met"]
    assert rows[1].reason.startswith("no interval was computed")


def test_a_limit_below_what_the_record_supports_is_not_decided():
    found = held(Figure(value=0.0, floor=2.0), Figure(value=0.0, floor=2.0), Figure(value=0.0, floor=0.5))
    assert [row.outcome for row in found.criteria[0].by_rating] == ["not decided by these data"] * 2 + ["met"]


def test_what_cannot_be_evaluated_gives_its_reason_and_no_rating():
    found = evaluate(DEMAND, RATINGS, [HOURS, AGEING], [])
    assert found.rating_kva is None
    assert found.criteria[1].by_rating[2].reason == "the study file does not give what this figure needs"


def test_the_criterion_with_the_least_room_governs():
    found = evaluate(
        DEMAND, RATINGS, [HOURS, AGEING], [],
        others=ageing_of(r10=Figure(value=0.2), r15=Figure(value=0.7), r25=Figure(value=0.1)),
    )  # fmt: skip
    by_hours, by_ageing = ([row.governs for row in result.by_rating] for result in found.criteria)
    assert by_hours == [True, False, False]
    assert by_ageing == [False, True, True]
    assert found.governing == "exceedance hours per year"


def test_a_criterion_at_its_limit_is_met_and_a_tie_governs_once():
    other = Criterion(quantity="top-oil temperature", limit=2.0, probability=0.1, source="x")
    found = evaluate(
        DEMAND, RATINGS, [AGEING, other], [],
        others={
            "ageing per year": lambda criterion, rating: Figure(value=1.0),
            "top-oil temperature": lambda criterion, rating: Figure(value=2.0),
        },
    )  # fmt: skip
    assert found.rating_kva == 10.0
    assert [result.by_rating[0].governs for result in found.criteria] == [True, False]


@pytest.mark.parametrize(
    ("installed_kva", "words"), [(10.0, "not adequate"), (25.0, "adequate"), (0.0, "")], ids=["small", "large", "new"]
)
def test_the_unit_in_service_is_judged(installed_kva, words):
    assert evaluate(DEMAND, RATINGS, [HOURS], [], installed_kva=installed_kva).installed == words


def test_a_criterion_without_a_source_says_so():
    found = evaluate(DEMAND, RATINGS, [Criterion(quantity=HOURS.quantity, limit=8.0)], [])
    assert not found.criteria[0].traced
    assert found.criteria[0].source == "not traced to a utility standard"


def test_reversed_flow_counts_only_in_its_direction():
    kw = np.ones((1, 100, 24))
    kw[0, :10, 12] = -12.0
    exporting = group_demand(
        [DayBlock(season="all", day_type="all days", days_per_year=365.0, day=np.arange(100), kw=kw)],
        interval_min=60,
        power_factor=1.0,
        settings=PLAIN,
    )
    value = {
        way: evaluate(
            exporting, [10.0], [Criterion(quantity=HOURS.quantity, limit=1.0, of="nameplate", direction=way)], []
        )
        .criteria[0]
        .by_rating[0]
        .value
        for way in ("both", "delivered", "exported")
    }
    assert value == pytest.approx({"both": 36.5, "delivered": 0.0, "exported": 36.5}, abs=1e-9)
