"""The report: results in, PDF out; nothing is computed here."""

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from loadsum.errors import InputError
from loadsum.report import figures
from loadsum.report.archive import Attachment, fixed_time, manifest
from loadsum.report.cleantext import CleanResults, clean
from loadsum.report.material import Material, Section
from loadsum.report.notation import NO_BREAK, Notation
from loadsum.report.sections import first_page, holdout, sections
from loadsum.report.sections.foundations import parts_left_out
from loadsum.report.sections.overview import units_in_detail
from loadsum.report.standards import meet_both_standards
from loadsum.report.templates import (
    Catalogue,
    catalogue,
    environment,
    logo,
    marked_up,
    templates_digest,
    templates_folder,
)
from loadsum.report.typeface import FALLBACK_FAMILY, TEXT_FAMILY
from loadsum.report.typesetting import typeset

PAPERS = {"A4": "210mm 297mm", "letter": "215.9mm 279.4mm"}
LONGEST_RUNNING_TITLE = 72
MOST_LISTED_FIGURES = 16
MOST_LINES_ON_FIRST_PAGE = 26

__all__ = ["Composed", "compose", "compose_test", "material", "printed", "render", "templates_folder"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Composed:
    """A report ready to be set.

    Parameters
    ----------
    html : str
        The pages, as a description.
    assets : mapping of str to (str, bytes)
        Media type and content of the pieces they refer to, by name.
    attachments : sequence of Attachment
        Everything to attach.
    figures : mapping of str to DrawnFigure
        Figures by name; each stands in ``assets`` as SVG.
    """

    html: str
    assets: Mapping[str, tuple[str, bytes]]
    attachments: Sequence[Attachment]
    figures: Mapping[str, figures.DrawnFigure]

    def figure_files(self) -> dict[str, bytes]:
        """The figures as SVG and PNG, by file name."""
        return figures.files(self.figures, {name: self.assets[f"{name}.svg"][1] for name in self.figures})


def render(
    results: Mapping[str, Any], *, attachments: Sequence[Attachment] = (), overrides: Path | None = None
) -> bytes:
    """The report as a PDF: what :func:`compose` makes, as :func:`printed`."""
    return printed(compose(results, attachments=attachments, overrides=overrides), results)


def printed(composed: Composed, results: Mapping[str, Any]) -> bytes:
    """A composed report as a PDF that is an archive file (PDF/A-3a) and accessible (PDF/UA-1) at once.

    Raises
    ------
    InputError
        A character cannot be printed, or a template of the utility is at fault.
    MachineError
        The text-layout libraries are missing.
    """
    return typeset(
        composed.html,
        assets=composed.assets,
        attachments=composed.attachments,
        finisher=meet_both_standards,
        iso_date=str((results.get("study") or {}).get("date") or ""),
    )


def material(results: Mapping[str, Any], overrides: Path | None = None) -> tuple[Material, CleanResults]:
    """Cleaned results with the words and notation of their language and region.

    Raises
    ------
    InputError
        A character of the results is in no font of the report.
    """
    cleaned = clean(results)
    if cleaned.faults:
        raise InputError("results", cleaned.faults[:50])
    study = cleaned.results.get("study") or {}
    t = catalogue(study.get("language") or "en", overrides)
    return Material(results=cleaned.results, t=t, n=notation(t, study.get("region") or "")), cleaned


def notation(t: Catalogue, region: str) -> Notation:
    """Numbers and dates as a region prints them."""
    forms = t.entry("notation")
    return Notation.from_catalogue(forms.get(region) or forms["international"], forms["months"], forms["none"])


def compose(
    results: Mapping[str, Any], *, attachments: Sequence[Attachment] = (), overrides: Path | None = None
) -> Composed:
    """A report ready to be set.

    Parameters
    ----------
    results : mapping
        Results as read from results.json.
    attachments : sequence of Attachment
        Files to put into the PDF; a manifest with their digests is added.
    overrides : Path or None
        Folder with the utility's own templates, texts and logo.

    Raises
    ------
    InputError
        A character cannot be printed, or a template or text of the utility is at fault.
    """
    m, cleaned = material(results, overrides)
    listed = [*attachments, manifest(results, attachments, templates_digest(overrides))]
    units = units_in_detail(m)
    drawn = figures.drawn(m, units)
    assets = {f"{name}.svg": ("image/svg+xml", figures.svg(figure.figure)) for name, figure in drawn.items()}
    own_logo = logo(overrides)
    if own_logo is not None:
        assets["logo"] = own_logo
    made = sections(m, units)
    env = environment(overrides)
    env.filters.update(css_string=css_string, strong=marked_up)
    first = first_page.content(m)
    html = env.get_template("report.html.j2").render(
        **_every_page(m),
        results=m.results,
        first=first,
        tight=first_page.lines(first) > MOST_LINES_ON_FIRST_PAGE,
        unchecked=_unchecked(m, made),
        sections=made,
        figures=drawn,
        listed_figures=_listed(made, drawn),
        terms=_terms(m),
        attached=sorted(a.name for a in listed),
        changes=[m.t(f"changed.{c.what}", where=c.where[:120], count=c.count) for c in cleaned.changes],
        logo=own_logo is not None,
    )
    return Composed(html=html, assets=assets, attachments=listed, figures=drawn)


def compose_test(results: Mapping[str, Any]) -> Composed:
    """The full hold-out test as a document of its own, ready to be set.

    Parameters
    ----------
    results : mapping
        Study heading, program and, by transformer, the test.

    Raises
    ------
    InputError
        A character cannot be printed.
    """
    m, _ = material(results)
    made = holdout.sections(m)
    drawn = figures.of_a_test(m)
    env = environment()
    env.filters.update(css_string=css_string, strong=marked_up)
    html = env.get_template("holdout.html.j2").render(**_every_page(m), sections=made, figures=drawn)
    assets = {f"{name}.svg": ("image/svg+xml", figures.svg(figure.figure)) for name, figure in drawn.items()}
    return Composed(html=html, assets=assets, attachments=(), figures=drawn)


def _every_page(m: Material) -> dict[str, Any]:
    """What the head of every document and its running lines need."""
    study = m.study
    return {
        "t": m.t,
        "n": m.n,
        "study": {"title": "", "reference": "", "place": "", **study},
        "title": study.get("title") or m.t("document_kind"),
        "authors": ", ".join(str(p["name"]) for p in m.rows("people") if p.get("name")),
        "program": _program(m),
        "created": fixed_time(str(study.get("date") or "")).strftime("%Y-%m-%dT%H:%M:%SZ"),
        "paper": PAPERS.get(study.get("page") or "A4", PAPERS["A4"]),
        "families": f'"{TEXT_FAMILY}", "{FALLBACK_FAMILY}"',
        "numbers": Numbers(),
        **_running(m),
    }


def _unchecked(m: Material, made: Sequence[Section]) -> str:
    """What was not checked, in one sentence with the number of the section that lists it."""
    number = [section.block for section in made].index("unchecked") + 1
    parts = [m.t(f"unchecked.short.{part}") for part in parts_left_out(m)]
    if not parts:
        return m.t("first_page.unchecked_all", number=number)
    return m.t("first_page.unchecked", parts=", ".join(parts), number=number)


def _listed(made: Sequence[Section], drawn: Mapping[str, Any]) -> list[str]:
    """Figures in the order they are printed; none where there are too many to list."""
    names = [name for section in made for part in (section, *section.content.get("parts", ())) for name in part.figures]
    known = [name for name in names if name in drawn]
    return known if len(known) <= MOST_LISTED_FIGURES else []


class Numbers:
    """Numbers of figures and tables, in the order they are printed."""

    def __init__(self) -> None:
        self._figures: dict[str, int] = {}
        self._tables = 0

    def figure(self, name: str) -> int:
        """Number of a figure; the same each time it is asked."""
        return self._figures.setdefault(name, len(self._figures) + 1)

    def table(self) -> int:
        """Number of the next table."""
        self._tables += 1
        return self._tables


def css_string(text: str) -> Any:
    """A text as a CSS string in which every sign that could end it is a numeric escape."""
    from markupsafe import Markup

    return Markup('"' + re.sub(r"[^ A-Za-z0-9.,:-]", lambda c: f"\\{ord(c[0]):06x} ", str(text)) + '"')


def _program(m: Material) -> str:
    program = m.part("program") or {}
    return f"{program.get('name', 'loadsum')} {program.get('version', '')}".strip()


def _terms(m: Material) -> list[tuple[str, str]]:
    interval = f"{m.interval_min}{NO_BREAK}min"
    return [(term, meaning.replace("{interval}", interval)) for term, meaning in m.t.entry("contents.terms")]


def _running(m: Material) -> dict[str, Any]:
    """Running title, reference, status and the words around the page number."""
    study = m.study
    title = study.get("title") or m.t("document_kind")
    if len(title) > LONGEST_RUNNING_TITLE:
        title = title[: LONGEST_RUNNING_TITLE - 1] + "…"
    reference = " · ".join(
        str(part)[:30]
        for part in (
            study.get("reference"),
            f"{m.t('fact.revision')} {study['revision']}" if study.get("revision") else "",
        )
        if part
    )
    before, middle, after = re.split(r"\{pages?\}", m.t.entry("word.page"))
    status = m.t(f"status.{study.get('status') or 'draft'}.word")
    return {
        "running_title": title,
        "running_reference": reference,
        "running_status": f"{_program(m)} · {status}",
        "page_words": (before, middle, after),
    }
