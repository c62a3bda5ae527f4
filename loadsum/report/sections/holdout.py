"""Sections of the full hold-out test, a document of its own."""

from collections.abc import Mapping, Sequence
from typing import Any

from loadsum.evidence.fullholdout import GROUPS_OF_A_SIZE
from loadsum.evidence.holdout import FEWEST_WEEKS
from loadsum.report.material import Material, Section, Unit
from loadsum.report.sections import evidence

IN_TURN = ("season", "day type", "part of the day", "month")


def sections(m: Material) -> tuple[Section, ...]:
    """Every section that the results of the test can fill."""
    return tuple(section for unit in m.units for section in _of_unit(m, unit))


def _of_unit(m: Material, unit: Unit) -> list[Section]:
    full = unit.part("holdout")
    if not full:
        text = str(unit.part("reason") or m.t("holdout.none", weeks=FEWEST_WEEKS))
        return [_section(m, unit, "holdout-none", "section_levels", {"text": text})]
    whole = evidence.section(m, unit)
    made = [] if whole is None else [_titled(m, unit, whole)]
    parts = full.get("parts") or ()
    in_turn = [_part(m, row) for row in parts if row["by"] in IN_TURN]
    made.append(_section(m, unit, "holdout-parts", "section_parts", {"rows": in_turn}))
    months = full.get("months_left_out")
    if months:
        rows = [_part(m, row) for row in parts if row["by"] == "month left out"]
        content = {"rows": rows, "how": months["how"], "sentence": months["sentence"]}
        made.append(_section(m, unit, "holdout-months", "section_months", content))
    sizes = [row for row in parts if row["by"] == "customers"]
    if sizes:
        content = {
            "how": m.t("holdout.sizes", groups=GROUPS_OF_A_SIZE),
            "models": [m.t.name("model", name) for name in sizes[0]["models"]],
            "rows": [_size(m, row) for row in sizes],
        }
        made.append(_section(m, unit, "holdout-sizes", "section_sizes", content))
    if full.get("daily_peaks"):
        content = {
            "days": [
                {
                    "meant": m.n.percent(row["expected_share"], 2),
                    "found": f"{m.n.fixed(row['observed_days'])} ({m.n.percent(row['observed_share'], 2)})",
                    "days": m.n.fixed(row["days"]),
                }
                for row in full["daily_peaks"]
            ],
            "runs": [_run(m, row) for row in full.get("runs") or ()],
        }
        made.append(_section(m, unit, "holdout-days", "section_days", content))
    notes = [m.t("evidence.not_tested"), *(_sentence(note) for note in full.get("notes") or ())]
    made.append(_section(m, unit, "holdout-notes", "section_notes", {"notes": notes}))
    return made


def _section(m: Material, unit: Unit, block: str, title: str, content: Mapping[str, Any]) -> Section:
    heading = m.t(f"holdout.{title}")
    if unit.several:
        heading = f"{m.t('holdout.unit', id=unit.id)}: {heading[0].lower()}{heading[1:]}"
    return Section(block=block, title=heading, content=content, unit=unit.index if unit.several else -1)


def _titled(m: Material, unit: Unit, section: Section) -> Section:
    own = _section(m, unit, section.block, "section_levels", section.content)
    return Section(block=own.block, title=own.title, content=own.content, figures=section.figures, unit=own.unit)


def _level(row: Mapping[str, Any], share: float, model: str = "adopted") -> Mapping[str, Any]:
    found: Mapping[str, Any] = next(
        level for level in row["levels"] if level["model"] == model and level["expected_share"] == share
    )
    return found


def _part(m: Material, row: Mapping[str, Any]) -> dict[str, Any]:
    one = _level(row, 0.01)
    return {
        "by": m.t.name("holdout.by", row["by"]),
        "name": row["name"],
        "intervals": m.n.fixed(row["intervals"]),
        "ten": m.n.percent(_level(row, 0.1)["observed_share"], 2),
        "one": m.n.percent(one["observed_share"], 2),
        "chance": m.between(one["chance_low"], one["chance_high"], lambda value: m.n.percent(value, 2)),
        "permille": m.n.percent(_level(row, 0.001)["observed_share"], 2),
        "failed": one["observed_share"] > one["chance_high"],
    }


def _size(m: Material, row: Mapping[str, Any]) -> dict[str, Any]:
    shares = [m.n.percent(_level(row, 0.01, model)["observed_share"], 2) for model in row["models"]]
    return {"name": row["name"], "shares": shares}


def _run(m: Material, row: Mapping[str, Any]) -> dict[str, str]:
    count = row["at_least_intervals"]
    return {
        "length": m.t("holdout.run_one") if count == 1 else m.t("holdout.run", count=count),
        "expected": m.n.fixed(row["expected"], 1),
        "found": m.n.fixed(row["observed"]),
        "error": m.n.fixed(row["standard_error"], 1),
    }


def _sentence(note: str) -> str:
    return f"{note[0].upper()}{note[1:]}."


def rows_of(full: Mapping[str, Any], unit: str) -> list[dict[str, Any]]:
    """Every figure as rows for a table: part, model and level."""
    whole = full["whole"]
    losses = {score["model"]: score["pinball_kw"] for score in whole["models"]}
    everything = {"by": "all", "name": "whole weeks in turn", **{k: whole[k] for k in ("intervals", "weeks", "levels")}}
    rows = _rows(everything, unit, losses)
    for part in full["parts"]:
        rows += _rows(part, unit, dict(zip(part["models"], part["pinball_kw"], strict=True)))
    return rows


def _rows(part: Mapping[str, Any], unit: str, losses: Mapping[str, float]) -> list[dict[str, Any]]:
    levels: Sequence[Mapping[str, Any]] = part["levels"]
    return [
        {
            "transformer": unit,
            "by": part["by"],
            "part": part["name"],
            "intervals": part["intervals"],
            "weeks": part["weeks"],
            **level,
            "pinball_kw": losses[level["model"]],
        }
        for level in levels
    ]
