"""Two studies held against each other: what changed, and the stages run again with some of the causes."""

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import partial
from pathlib import Path

from loadsum import pipeline
from loadsum.intake.load import Loaded, load_readings
from loadsum.intake.revised import reading_changes, with_changes
from loadsum.progress import Progress
from loadsum.report import revision
from loadsum.report.archive import RESULTS_FILE
from loadsum.report.received import read_results
from loadsum.report.results import encode
from loadsum.study.load import load_study
from loadsum.study.pseudonyms import key_beside, pseudonyms
from loadsum.study.tables import Study


def compare(old: Path, new: Path, *, progress: Progress, studies: tuple[Path, Path] | None = None) -> str:
    """What changed from one study to its revision, and how much each cause moved the verdict.

    Parameters
    ----------
    old, new : Path
        results.json of either study, or the folder that holds it.
    progress : Progress
        Told how far the work is.
    studies : (Path, Path) or None
        Study files of the two with their meter files; without them the causes have no shares.
    """
    before, after = read_results(_file(old)), read_results(_file(new))
    lines = [str(change) for change in revision.compare(before, after)] or ["nothing changed"]
    if studies is not None:
        lines += shares_of_change(*studies, moved=revision.moved(before, after), progress=progress)
    return "\n".join(lines)


def shares_of_change(old: Path, new: Path, *, moved: Sequence[str], progress: Progress) -> list[str]:
    """How much each cause moved the room under the governing criterion, in words.

    Parameters
    ----------
    old, new : Path
        Study files of the two.
    moved : sequence of str
        Transformers whose verdict moved; where there is none, the first that both studies have is taken.
    progress : Progress
        Told how far the work is.
    """
    asked = load_study(old), load_study(new)
    loaded = load_readings(asked[0], old.parent), load_readings(asked[1], new.parent)
    if asked[0].study.demand_interval_min != asked[1].study.demand_interval_min:
        return ["shares of the change: none, the two studies have different demand intervals"]
    by_readings = {change.cause: change for change in reading_changes(loaded[0].readings, loaded[1].readings)}
    tables = [name for name in revision.STUDY_CAUSES if getattr(asked[0], name) != getattr(asked[1], name)]
    by_table = {f"[{name}] changed": name for name in tables}
    causes = [*by_readings, *by_table]
    if not causes:
        return ["shares of the change: there is no cause"]
    both = {unit.id for unit in asked[0].transformer} & {unit.id for unit in asked[1].transformer}
    shared = [unit for unit in asked[1].transformer if unit.id in both]
    if not shared:
        return ["shares of the change: none, the two studies have no transformer in common"]
    units = [unit for unit in shared if unit.id in moved] or shared[:1]
    asked_for, expected = 0, len(units) * 2 ** min(len(causes), revision.MOST_EXACT)

    def with_some(chosen: frozenset[str]) -> tuple[Study, Loaded]:
        hybrid = replace(asked[0], **{by_table[c]: getattr(asked[1], by_table[c]) for c in chosen if c in by_table})
        parts = [change for cause, change in by_readings.items() if cause in chosen]
        weather = loaded[1] if any(change.kind == "period added" for change in parts) else loaded[0]
        return hybrid, replace(weather, readings=with_changes(loaded[0].readings, loaded[1].readings, parts))

    def room(unit: str, rating: float, chosen: frozenset[str]) -> float:
        nonlocal asked_for
        asked_for += 1
        progress("computing with some of the causes", min(asked_for / expected, 1.0))
        results = pipeline.with_readings(*with_some(chosen), only=unit)
        return revision.room_at(encode(results)["selection"], rating)

    named: Callable[[str], str] = str
    if not asked[1].privacy.raw_identifiers:
        key, _ = key_beside(new, asked[1].privacy.key_file)
        everybody = {*loaded[0].readings.customers, *loaded[1].readings.customers}
        named = pseudonyms(sorted(everybody), key).cause
    lines = []
    for unit in units:
        rating = revision.judged_rating(unit)
        found = revision.shares(causes, partial(room, unit.id, rating))
        of = f", {unit.id}" if unit.id else ""
        lines.append(f"room under the governing criterion at {rating:g} kVA{of}, as a share of its limit:")
        lines += [f"  {named(one.cause)}: {one.change:+.4f} ({_of_change(one.share)})" for one in found]
    return lines


def _of_change(share: float) -> str:
    """A share of the change in words."""
    return f"{share:.0%} of the change" if math.isfinite(share) else "the room did not change, or is not known"


def _file(path: Path) -> Path:
    """results.json, given itself or as the folder that holds it."""
    return path / RESULTS_FILE if path.is_dir() else path
