"""The choice of rating in words."""

from collections.abc import Iterator, Mapping, Sequence
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
    kind = str(selection.get("verdict") or "no criterion").replace(" ", "_")
    rating = selection.get("rating_kva")
    row = exceedance_of(unit.results, rating)
    sentence = m.t(f"verdict.{kind}.sentence", rating=m.kva(rating))
    if kind == "chosen" and _all_meet(selection):
        sentence = m.t("verdict.chosen.all", rating=m.kva(rating))
    if selection.get("undecided_kva"):
        named = ", ".join(m.kva(one) for one in selection["undecided_kva"])
        sentence += " " + m.t("verdict.undecided", ratings=named)
    return Verdict(
        headline=m.kva(rating) if rating is not None else m.t(f"verdict.{kind}.headline"),
        rating_kva=rating,
        sentence=sentence,
        reasons=tuple(_reasons(m, unit, selection, row)),
        action=m.t(f"verdict.{kind}.action", rating=m.kva(rating)),
        hours=row.get("hours_per_year") if row is not None else None,
    )


def _all_meet(selection: Mapping[str, Any]) -> bool:
    return all(
        row.get("meets") is True for one in selection.get("criteria") or () for row in one.get("by_rating") or ()
    )


def _reasons(m: Material, unit: Unit, selection: Mapping[str, Any], row: Mapping[str, Any] | None) -> Iterator[str]:
    """Unit in service, expected hours, highest probability, what governs."""
    installed, found = unit.results.get("installed_kva"), str(selection.get("installed") or "")
    if installed and found and m.t.has(f"installed.{found}"):
        yield m.t(f"installed.{found}", rating=m.kva(installed))
    minutes = f"{m.interval_min}{NO_BREAK}min"
    if row is not None:
        interval = m.between(row.get("hours_low"), row.get("hours_high"), m.hours)
        yield m.t(
            "first_page.hours" if row.get("hours_low") is not None else "first_page.hours_alone",
            rating=m.kva(row.get("rating_kva")),
            of=m.t.name("loading", str(row.get("of"))),
            hours=m.hours(row.get("hours_per_year")),
            interval=interval,
            minutes=minutes,
        )
        yield m.t(
            "first_page.highest",
            probability=m.n.probability(row.get("highest_probability"), row.get("floor")),
            where=m.hour_class(row.get("highest_at")),
            minutes=minutes,
        )
    governing = _governing(selection)
    if governing is not None:
        criterion, at = governing
        quantity = str(criterion.get("quantity"))
        yield m.t(
            "first_page.governs",
            name=lower_first(m.t.name("criterion", quantity)),
            rating=m.kva(at.get("rating_kva")),
            value=quantity_text(m, quantity, at.get("value"), at.get("floor")),
            limit=limit_text(m, quantity, at.get("limit")),
            source=criterion.get("source") or m.t("ratings.untraced"),
        )


def _governing(selection: Mapping[str, Any]) -> tuple[Mapping[str, Any], Mapping[str, Any]] | None:
    """The criterion that leaves the least room at the chosen rating, and its figure there."""
    for criterion in selection.get("criteria") or ():
        for row in criterion.get("by_rating") or ():
            if row.get("rating_kva") == selection.get("rating_kva") and row.get("governs"):
                return criterion, row
    return None


def lower_first(text: str) -> str:
    """A name as it stands inside a sentence."""
    return text[:1].lower() + text[1:]


def limit_text(m: Material, quantity: str, limit: float | None) -> str:
    """A limit in its own unit, with the digits it was given with."""
    if "probability" in quantity and limit is not None:
        return m.plain(100.0 * limit) + NO_BREAK + "%"
    if "hours" in quantity:
        return m.plain(limit) + NO_BREAK + "h"
    return m.temperature(limit) if "temperature" in quantity else m.plain(limit)


def quantity_text(m: Material, quantity: str, value: float | None, floor: float | None = None) -> str:
    """A criterion's figure in its own unit."""
    if "probability" in quantity:
        return m.n.probability(value, floor)
    if "temperature" in quantity:
        return m.temperature(value)
    if "hours" in quantity:
        return m.hours(value) + NO_BREAK + "h"
    return m.n.significant(value)


def meets_text(m: Material, row: Mapping[str, Any] | None) -> str:
    """Whether a criterion is met at a rating, in a word or two."""
    if row is None:
        return m.n.none
    outcome = str(row.get("outcome") or "")
    if outcome and m.t.has(f"outcome.{outcome}"):
        return m.t(f"outcome.{outcome}")
    meets = row.get("meets")
    return m.t("outcome.not decided by these data" if meets is None else "outcome.met" if meets else "outcome.not met")
