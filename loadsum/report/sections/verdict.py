"""The choice of rating in words."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from loadsum.report.material import Material
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
    """

    headline: str
    rating_kva: float | None
    sentence: str
    reasons: tuple[str, ...]
    action: str


def exceedance_rows(transformer: Mapping[str, Any]) -> Sequence[Mapping[str, Any]]:
    """Exceedance by rating."""
    return transformer.get("exceedance") or ()


def exceedance_of(transformer: Mapping[str, Any], rating_kva: float | None) -> Mapping[str, Any] | None:
    """Exceedance of one rating's allowed loading; None where it is not among the results."""
    for row in exceedance_rows(transformer):
        if rating_kva is not None and row.get("rating_kva") == rating_kva:
            return row
    return None


def verdict(m: Material, transformer: Mapping[str, Any]) -> Verdict:
    """The verdict on one transformer in words."""
    selection = transformer.get("selection") or {}
    kind = selection.get("verdict") or "no criterion"
    rating = selection.get("rating_kva")
    key = kind.replace(" ", "_").replace(",", "")
    headline = m.kva(rating) if rating is not None else m.t(f"verdict.{key}.headline")
    row = exceedance_of(transformer, rating)
    reasons = []
    if row is not None:
        reasons.append(
            m.t(
                "first_page.hours",
                rating=m.kva(rating),
                of=m.t.name("loading", str(row.get("of"))),
                hours=m.hours(row.get("hours_per_year")),
                interval=m.between(row.get("hours_low"), row.get("hours_high"), m.hours),
                minutes=f"{m.interval_min}{NO_BREAK}min",
            )
        )
        reasons.append(
            m.t(
                "first_page.highest",
                probability=m.n.probability(row.get("highest_probability"), row.get("floor")),
                where=m.hour_class(row.get("highest_at")),
                minutes=f"{m.interval_min}{NO_BREAK}min",
            )
        )
    return Verdict(
        headline=headline,
        rating_kva=rating,
        sentence=m.t(f"verdict.{key}.sentence", rating=m.kva(rating)),
        reasons=tuple(reasons),
        action=m.t(f"verdict.{key}.action", rating=m.kva(rating)),
    )
