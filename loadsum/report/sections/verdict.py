"""The choice of rating in words."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from loadsum.report.material import Material, Unit
from loadsum.report.notation import NO_BREAK


@dataclass(frozen=True, slots=True, kw_only=True)
class Verdict:
    """What page 1 says of one transformer.

    Parameters
    ----------
    headline : str
        The rating, or the few words that stand in its place.
    rating_kva : float or None
        Recommended rating; None where there is no verdict. [kVA]
    sentence : str
        The verdict.
    reasons : tuple of str
        Probability, hours, what governs.
    action : str
        What to do.
    hours : float or None
        Expected hours above the loading allowed of the rating. [h]
    """

    headline: str
    rating_kva: float | None
    sentence: str
    reasons: tuple[str, ...]
    action: str
    hours: float | None


def exceedance_rows(results: Mapping[str, Any]) -> Sequence[Mapping[str, Any]]:
    """Exceedance by rating."""
    return results.get("exceedance") or ()


def exceedance_of(results: Mapping[str, Any], rating_kva: float | None) -> Mapping[str, Any] | None:
    """Exceedance of one rating, of the loading that the criteria speak of; None where it is not among the results."""
    rows = [row for row in exceedance_rows(results) if rating_kva is not None and row.get("rating_kva") == rating_kva]
    wanted = [c.get("of") for c in (results.get("selection") or {}).get("criteria") or ()]
    rows.sort(key=lambda row: (row.get("of") not in wanted, row.get("of") == "nameplate"))
    return rows[0] if rows else None


def needs_attention(unit: Unit) -> bool:
    """Whether a transformer of several gets a section of its own: no verdict, or another rating than the one there."""
    if unit.results.get("reason"):
        return True
    selection = unit.part("selection") or {}
    rating, installed = selection.get("rating_kva"), unit.results.get("installed_kva")
    return selection.get("verdict") != "chosen" or not installed or (rating or 0.0) > installed


def verdict(m: Material, unit: Unit) -> Verdict:
    """The verdict on one transformer in words."""
    selection = unit.part("selection") or {}
    kind = selection.get("verdict") or "no criterion"
    rating = selection.get("rating_kva")
    key = kind.replace(" ", "_").replace(",", "")
    row = exceedance_of(unit.results, rating)
    reasons = []
    if row is not None:
        minutes = f"{m.interval_min}{NO_BREAK}min"
        reasons.append(
            m.t(
                "first_page.hours",
                rating=m.kva(rating),
                of=m.t.name("loading", str(row.get("of"))),
                hours=m.hours(row.get("hours_per_year")),
                interval=m.between(row.get("hours_low"), row.get("hours_high"), m.hours),
                minutes=minutes,
            )
        )
        reasons.append(
            m.t(
                "first_page.highest",
                probability=m.n.probability(row.get("highest_probability"), row.get("floor")),
                where=m.hour_class(row.get("highest_at")),
                minutes=minutes,
            )
        )
    return Verdict(
        headline=m.kva(rating) if rating is not None else m.t(f"verdict.{key}.headline"),
        rating_kva=rating,
        sentence=m.t(f"verdict.{key}.sentence", rating=m.kva(rating)),
        reasons=tuple(reasons),
        action=m.t(f"verdict.{key}.action", rating=m.kva(rating)),
        hours=row.get("hours_per_year") if row is not None else None,
    )
