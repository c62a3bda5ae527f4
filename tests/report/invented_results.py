"""An invented study in the form of results.json, for tests of layout and wording; no figure in it means anything."""

import itertools
import math
from typing import Any

import numpy as np
from scipy.stats import gamma, norm

SEASONS = {"winter": 90.25, "spring": 92.0, "summer": 92.0, "autumn": 91.0}
RATINGS_KVA = (15.0, 25.0, 37.5, 50.0)
POWER_FACTOR = 0.95


def _mean_kw(season: str, day_type: str, hour: int) -> float:
    level = {"winter": 14.0, "spring": 9.0, "summer": 7.5, "autumn": 10.0}[season]
    evening = math.exp(-((hour - 19.0) ** 2) / 6.0)
    morning = math.exp(-((hour - (7.5 if day_type == "workday" else 10.0)) ** 2) / 4.0)
    return level * (0.45 + 0.85 * evening + 0.45 * morning)


def hours() -> list[dict[str, Any]]:
    """Every hour of four seasons and two day types."""
    rows = []
    for season, days in SEASONS.items():
        for day_type, share in (("workday", 5 / 7), ("weekend or holiday", 2 / 7)):
            for hour in range(24):
                mean = _mean_kw(season, day_type, hour)
                sd = 0.22 * mean + 0.6
                a, scale = (mean / sd) ** 2, sd * sd / mean
                n_days = round(days * share)
                rows.append(
                    {
                        "season": season,
                        "day_type": day_type,
                        "interval": hour,
                        "starts": f"{hour:02d}:00",
                        "hours_per_year": days * share,
                        "n_days": n_days,
                        "mean_kw": mean,
                        "sd_kw": sd,
                        "skewness": 2 / math.sqrt(a),
                        **{
                            name: float(gamma.isf(p, a, scale=scale))
                            for name, p in (("q50_kw", 0.5), ("q90_kw", 0.1), ("q99_kw", 0.01), ("q999_kw", 0.001))
                        },
                        "floor": 0.1 / (n_days + 1),
                    }
                )
    return rows


def curve(rows: list[dict[str, Any]]) -> dict[str, Any]:
    """Year-averaged exceedance by the gamma law of each hour, and by normal laws beside it."""
    levels = np.linspace(5.0, 55.0, 120)
    weight = np.array([r["hours_per_year"] for r in rows])
    mean, sd = (np.array([r[k] for r in rows]) for k in ("mean_kw", "sd_kw"))
    a, scale = (mean / sd) ** 2, sd**2 / mean
    share = weight / weight.sum()
    adopted = gamma.sf(levels[:, None], a, scale=scale) @ share
    normal = norm.sf(levels[:, None], mean, sd) @ share
    independent = gamma.sf(levels[:, None], (mean / (0.7 * sd)) ** 2, scale=(0.7 * sd) ** 2 / mean) @ share
    return {
        "levels_kw": levels.tolist(),
        "adopted": adopted.tolist(),
        "lower": (0.97 * adopted).tolist(),
        "upper": (1.03 * adopted).clip(max=1.0).tolist(),
        "normal": normal.tolist(),
        "normal_independent": (norm.sf(levels[:, None], mean, 0.7 * sd) @ share).tolist(),
        "independent": independent.tolist(),
        "observed": np.where(adopted > 2e-4, adopted * 1.04, 0.0).clip(max=1.0).tolist(),
        "floor": 1e-4,
    }


def above(row: dict[str, Any], level_kva: float) -> float:
    """Probability above a level in one hour."""
    a, scale = (row["mean_kw"] / row["sd_kw"]) ** 2, row["sd_kw"] ** 2 / row["mean_kw"]
    return float(gamma.sf(level_kva * POWER_FACTOR, a, scale=scale))


def hour_map(rows: list[dict[str, Any]]) -> dict[str, Any]:
    """Exceedance by rating, class of days and hour."""
    return {
        "ratings_kva": list(RATINGS_KVA),
        "season": [rows[i]["season"] for i in range(0, len(rows), 24)],
        "day_type": [rows[i]["day_type"] for i in range(0, len(rows), 24)],
        "level_kva": [[r] * 8 for r in RATINGS_KVA],
        "probability": [
            [[above(row, r) for row in rows[i : i + 24]] for i in range(0, len(rows), 24)] for r in RATINGS_KVA
        ],
        "floor": [[row["floor"] for row in rows[i : i + 24]] for i in range(0, len(rows), 24)],
    }


def quality() -> dict[str, Any]:
    """State of the readings by customer and day."""
    signs = {}
    for n in range(1, 10):
        row = ["f"] * 365
        row[70 + 13 * n : 70 + 15 * n] = ["p"] * (2 * n)
        if n == 4:
            row[200:214] = ["-"] * 14
        if n == 7:
            row[300:330] = ["e"] * 30
        signs[f"C-{n:02d}"] = [[len(list(run)), sign] for sign, run in itertools.groupby(row)]
    return {"first_day": 21915, "days": 365, "customers": signs}


def criterion(quantity: str, limit: float, statistic: str, values: list[float]) -> dict[str, Any]:
    """One criterion held against every rating."""
    by_rating = [
        {
            "rating_kva": rating,
            "value": value,
            "low": 0.6 * value,
            "high": 1.7 * value,
            "limit": limit,
            "margin": limit - value,
            "meets": value <= limit,
            "governs": rating == 37.5 and "hours" in quantity,
        }
        for rating, value in zip(RATINGS_KVA, values, strict=True)
    ]
    return {
        "quantity": quantity,
        "of": "allowed loading, normal",
        "limit": limit,
        "statistic": statistic,
        "source": "invented loading standard, clause 4.2",
        "by_rating": by_rating,
    }


def peaks() -> dict[str, Any]:
    """Levels of days and years."""

    def rare(probability: float, level: float) -> dict[str, Any]:
        return {
            "probability": probability,
            "level_kva": level,
            "standard_error": 0.002,
            "lowest_kva": 0.96 * level,
            "highest_kva": 1.08 * level,
            "supported": probability >= 0.1,
            "shift_kva": 0.4,
        }

    return {
        "copula": "Gaussian copula of the intervals of a day",
        "assumption": "days are independent within their class",
        "direction": "delivered",
        "levels": [
            {
                "name": f"{rating:g} kVA",
                "level_kva": [rating] * 8,
                "days_per_year": days,
                "days_standard_error": 0.1,
                "year": year,
                "year_at_least": 0.7 * year,
                "year_at_most": min(1.4 * year, 1.0),
            }
            for rating, days, year in zip(
                RATINGS_KVA, (160.0, 12.0, 0.1, 0.0001), (1.0, 1.0, 0.09, 0.0001), strict=True
            )
        ],
        "daily": [rare(p, 14.0 - 4.0 * math.log10(p)) for p in (0.5, 0.1, 0.05, 0.01)],
        "annual": [rare(1.0 / n, 30.0 + 3.0 * math.log10(n)) for n in (2, 5, 10, 20)],
        "time_of_peak": [[1.0 / 24] * 24] * 8,
        "weather_years": 0,
    }


def diversity() -> dict[str, Any]:
    """Factors of the group and maximum demand by number of customers."""
    number = [1, 2, 3, 5, 9, 15, 25, 40, 60]
    return {
        "coincidence_factor": 0.53,
        "diversity_factor": 1.89,
        "admd_kw": 3.4,
        "load_factor": 0.31,
        "loss_factor": 0.14,
        "utilisation_factor": 1.1,
        "growth": {
            "customers": number,
            "expected_kw": [2.4 * n + 4.2 * math.sqrt(n) for n in number],
            "q90_kw": [2.5 * n + 5.4 * math.sqrt(n) for n in number],
        },
        "laws": [
            {"name": "square-root law", "kw": [2.1 * n + 4.5 * math.sqrt(n) for n in number], "source": "invented"},
            {"name": "two-term law", "kw": [2.6 * n + 3.1 * math.sqrt(n) for n in number], "source": "invented"},
        ],
    }


def thermal() -> dict[str, Any]:
    """Temperature and ageing by rating."""
    rows = []
    for rating in RATINGS_KVA:
        load = 30.0 / rating
        hot = [45.0 + 55.0 * load**1.6 + 6.0 * float(norm.isf(1.0 - (k + 0.5) / 50)) for k in range(50)]
        ageing = [0.001 * math.exp(0.09 * (t - 60.0)) for t in hot]
        rows.append(
            {
                "rating_kva": rating,
                "hot_spot_quantiles_c": hot,
                "ageing_quantiles_pu": ageing,
                "hot_spot_yearly_high_c": hot[25],
                "hot_spot_1_year_in_10_c": hot[45],
                "top_oil_yearly_high_c": hot[25] - 14.0,
                "probability_above_limit": sum(t > 110.0 for t in hot) / 50,
                "ageing_pu": ageing[25],
            }
        )
    return {
        "model": "IEEE C57.91, clause 7",
        "hot_spot_limit_c": 110.0,
        "by_rating": rows,
        "assumed": ["oil time constant 3 h", "ratio of load to no-load losses 5"],
    }


def losses() -> dict[str, Any]:
    """Losses and cost by rating."""
    return {
        "currency": "EUR",
        "by_rating": [
            {
                "rating_kva": rating,
                "no_load_kwh": 12.0 * rating,
                "load_kwh": 9000.0 / rating,
                "present_worth": 14.0 * rating + 9000.0 / rating,
                "owning_cost": 1500.0 + 40.0 * rating,
            }
            for rating in RATINGS_KVA
        ],
    }


def scenarios() -> list[dict[str, Any]]:
    """Load to come."""
    return [
        {
            "name": name,
            "note": note,
            "by_rating": [
                {"rating_kva": rating, "hours_per_year": min(factor * 3e6 / rating**4, 8766.0), "first_year": year}
                for rating, year in zip(RATINGS_KVA, (None, None, 2036 if factor > 5 else None, None), strict=True)
            ],
        }
        for name, note, factor in (
            ("as metered", "", 1.0),
            ("5 chargers, diversified", "11 kW each", 6.0),
            ("5 chargers, tariff start", "declared synchronised", 60.0),
        )
    ]


def headroom() -> list[dict[str, Any]]:
    """Room left."""
    return [
        {
            "rating_kva": rating,
            "what": "home, electric heating",
            "count": count,
            "kw": 1.9 * count,
            "limited_by": "exceedance hours per year",
        }
        for rating, count in zip(RATINGS_KVA, (0, 0, 3, 9), strict=True)
    ]


def evidence() -> dict[str, Any]:
    """Hold-out test."""
    shares = (0.5, 0.1, 0.01, 0.001)
    found = {
        "adopted": (0.51, 0.104, 0.0108, 0.0013),
        "normal": (0.47, 0.095, 0.016, 0.0042),
        "independent": (0.5, 0.14, 0.031, 0.0095),
        "observed_sum": (0.5, 0.105, 0.015, 0.0061),
    }
    return {
        "sentence": "On held-out weeks demand exceeded the 99 % level 1.1 % of the time, as it should.",
        "how": "26 weeks each way, 8700 held-out intervals.",
        "levels": [
            {
                "model": model,
                "expected_share": share,
                "observed_share": got,
                "expected_count": 8700 * share,
                "observed_count": round(8700 * got),
                "chance_low": share / (1.0 + 0.05 / math.sqrt(share)),
                "chance_high": share * (1.0 + 0.05 / math.sqrt(share)),
            }
            for model, row in found.items()
            for share, got in zip(shares, row, strict=True)
        ],
        "models": [
            {"model": "adopted", "pinball_kw": 0.083, "crps_kw": 0.91},
            {"model": "normal", "pinball_kw": 0.097, "crps_kw": 0.93},
            {"model": "independent", "pinball_kw": 0.121, "crps_kw": 0.96},
        ],
    }


def without_figures(study: dict[str, Any]) -> dict[str, Any]:
    """The study without what figures are drawn from, for tests of words: drawing takes most of the time."""
    heavy = {"hours", "curve", "hour_map", "peaks", "diversity", "thermal", "scenarios"}
    units = [{name: value for name, value in unit.items() if name not in heavy} for unit in study["transformers"]]
    return {**{name: value for name, value in study.items() if name != "quality"}, "transformers": units}


def results() -> dict[str, Any]:
    """A whole study of nine homes."""
    rows = hours()
    total = [sum(r["hours_per_year"] * above(r, rating) for r in rows) for rating in RATINGS_KVA]
    highest = [max(above(r, rating) for r in rows) for rating in RATINGS_KVA]
    exceedance = [
        {
            "rating_kva": rating,
            "of": "allowed loading, normal",
            "level_kva": rating,
            "hours_per_year": total[i],
            "hours_low": 0.6 * total[i],
            "hours_high": 1.7 * total[i],
            "hours_lower": 0.997 * total[i],
            "hours_upper": 1.003 * total[i],
            "highest_probability": highest[i],
            "highest_low": 0.5 * highest[i],
            "highest_high": min(1.9 * highest[i], 1.0),
            "floor": 0.1 / 66,
            "highest_at": {"season": "winter", "day_type": "workday", "interval": 19, "starts": "19:00"},
            "normal_factor": [0.93, 0.61, 0.08, 0.0004][i],
        }
        for i, rating in enumerate(RATINGS_KVA)
    ]
    return {
        "schema_version": 1,
        "program": {
            "name": "loadsum",
            "version": "0.1.0",
            "dependencies": {"numpy": "2.4.6", "scipy": "1.17.1", "weasyprint": "70.0", "matplotlib": "3.11.2"},
        },
        "study": {
            "title": "Pole transformer at Mill Lane",
            "reference": "DP-0117",
            "revision": "A",
            "status": "for review",
            "date": "2031-05-04",
            "question": "Which rating should replace the 25 kVA unit that serves nine homes at Mill Lane?",
            "place": "Mill Lane, Exampleton",
            "region": "international",
            "time_zone": "Europe/Oslo",
            "demand_interval_min": 60,
            "page": "A4",
            "temperature_unit": "C",
            "language": "en",
        },
        "people": [
            {"role": "prepared", "name": "A. Planner", "registration": ""},
            {"role": "checked", "name": "B. Checker", "registration": ""},
            {"role": "responsible engineer", "name": "C. Engineer", "registration": "PE 00000"},
        ],
        "inputs": [
            {
                "name": name,
                "sha256": f"{index:064x}",
                "bytes": 123456 + index,
                "format": "delimited text, one row a reading",
                "choices": ["stamps taken as interval start", "clock: local, with daylight saving"],
            }
            for index, name in enumerate(("study.toml", "meters.csv", "weather.csv"), start=10)
        ],
        "coverage": {
            "first_day": "2030-01-01",
            "last_day": "2030-12-31",
            "days": 363,
            "hours_in_year": 8766.0,
            "covered_hours": 8766.0,
            "uncovered": [],
            "whole_year": True,
        },
        "customers": [
            {
                "id": f"C-{n:02d}",
                "customer_class": "home, electric heating" if n % 3 else "home",
                "role": "existing",
                "readings": 8700 - 11 * n,
                "days": 363 - n // 2,
                "mean_kw": 0.8 + 0.13 * n,
                "max_kw": 5.1 + 0.4 * n,
                "annual_kwh": 8766 * (0.8 + 0.13 * n),
            }
            for n in range(1, 10)
        ],
        "findings": [
            {
                "rule": "gap",
                "severity": "caution",
                "customer": "C-04",
                "place": "2030-03-12 02:00",
                "count": 26,
                "excluded": 0,
                "message": "26 readings are missing, the longest run 14 intervals",
                "effect": "the hours concerned rest on one day less",
            },
            {
                "rule": "stuck run",
                "severity": "excluded",
                "customer": "C-07",
                "place": "meters.csv:41210",
                "count": 31,
                "excluded": 31,
                "message": "31 equal readings in a row at 1.24 kW",
                "effect": "not used",
            },
        ],
        "quality": quality(),
        "transformers": [
            {
                "id": "T-204",
                "installed_kva": 25.0,
                "phases": 1,
                "power_factor": POWER_FACTOR,
                "exceedance": exceedance,
                "curve": curve(rows),
                "hour_map": hour_map(rows),
                "hours": rows,
                "diagnostics": [
                    {
                        "season": season,
                        "day_type": day_type,
                        "days": 60,
                        "correlation": 0.11,
                        "correlation_low": 0.07,
                        "correlation_high": 0.15,
                        "variance_ratio": 1.0,
                        "temperature_explains": 0.31,
                        "record_days_outside": 0,
                        "share_below_zero": 0.0,
                    }
                    for season in SEASONS
                    for day_type in ("workday", "weekend or holiday")
                ],
                "peaks": peaks(),
                "diversity": diversity(),
                "thermal": thermal(),
                "losses": losses(),
                "scenarios": scenarios(),
                "headroom": headroom(),
                "evidence": evidence(),
                "selection": {
                    "verdict": "chosen",
                    "rating_kva": 37.5,
                    "criteria": [
                        criterion("exceedance hours per year", 10.0, "predictive value", total),
                        criterion("exceedance probability in any interval", 0.05, "upper end of interval", highest),
                    ],
                },
            }
        ],
        "assumptions": [
            {
                "name": "power factor of the group",
                "value": "0.95",
                "unit": "",
                "source": "stated in the study file, no measurement",
                "decided_by": "A. Planner",
                "effect": "0.90 raises the expected hours above 37.5 kVA from 1.2 to 3.4; the verdict stands",
            },
            {
                "name": "losses between meters and transformer",
                "value": "0",
                "unit": "%",
                "source": "not given",
                "decided_by": "program default",
                "effect": "each per cent raises every level by one per cent",
            },
        ],
        "references": [
            {
                "text": "Esscher, F. On the probability function in the collective theory of risk. 1932.",
                "provenance": "memory",
            }
        ],
        "seed": 1,
    }
