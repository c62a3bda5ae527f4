"""HTML to PDF: known pieces only, no network, no files, and nothing left out without a fault."""

import gc
import io
import logging
import warnings
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import Any

from loadsum.errors import Fault, InputError
from loadsum.report import renderer
from loadsum.report.archive import Attachment, embedded_files
from loadsum.report.typeface import character_name, missing_characters, shipped_fonts_only

Finisher = Callable[[Any, Any], None]


def typeset(
    html: str,
    *,
    assets: Mapping[str, tuple[str, bytes]],
    attachments: Sequence[Attachment],
    finisher: Finisher,
    iso_date: str,
) -> bytes:
    """A page description as PDF bytes.

    Parameters
    ----------
    html : str
        The document; it may refer to pieces as ``asset:name`` and to nothing else.
    assets : mapping
        Media type and content by name.
    attachments : sequence of Attachment
        Files put into the PDF.
    finisher : callable
        Called with the document and the PDF before it is written.
    iso_date : str
        Date of every date in the PDF.

    Raises
    ------
    MachineError
        The text-layout libraries are missing.
    InputError
        A character is in no shipped font, or a template asks for something that is not there.
    """
    with shipped_fonts_only(), _collected_rarely():
        weasyprint = renderer.load()
        from weasyprint.text.fonts import FontConfiguration
        from weasyprint.urls import FatalURLFetchingError

        with quiet_renderer() as complaints:
            document = weasyprint.HTML(string=html, base_url="asset:", url_fetcher=Shelf(assets))
            _every_character_known("".join(document.etree_element.itertext()))
            _harmless_links_only(document.etree_element)
            target = io.BytesIO()
            try:
                document.write_pdf(
                    target,
                    pdf_variant="pdf/a-3a",
                    font_config=FontConfiguration(),
                    finisher=finisher,
                    attachments=embedded_files(attachments, iso_date),
                )
            except FatalURLFetchingError as error:
                raise InputError("report templates", [Fault("template", str(error))]) from error
    if complaints:
        raise InputError("report templates", [Fault("template", text) for text in complaints])
    return target.getvalue()


def _every_character_known(text: str) -> None:
    missing = missing_characters(text)
    if missing:
        raise InputError(
            "report",
            [Fault("text", f"character {character_name(c)} is in no font of the report; replace it") for c in missing],
        )


def _harmless_links_only(root: Any) -> None:
    """A template may link inside the document, to https and to mail, and to nothing else."""
    faults = [
        Fault("template", f"a link to {href[:120]!r}; only #, https: and mailto: are allowed")
        for href in (element.get("href") or "" for element in root.iter() if element.tag in ("a", "area", "link"))
        if not href.startswith(("#", "https:", "mailto:"))
    ]
    if faults:
        raise InputError("report templates", faults)


class Shelf:
    """Serves the pieces it was given and refuses everything else."""

    def __init__(self, assets: Mapping[str, tuple[str, bytes]]) -> None:
        self._assets = assets

    def __call__(self, url: str) -> Any:
        from weasyprint.urls import FatalURLFetchingError, URLFetcherResponse

        scheme, _, name = url.partition(":")
        if scheme != "asset" or name not in self._assets:
            raise FatalURLFetchingError(f"the report may not fetch {url[:200]!r}")
        kind, content = self._assets[name]
        return URLFetcherResponse(url, content, {"Content-Type": kind})


class _Collector(logging.Handler):
    """Keeps what the renderer complains of."""

    def __init__(self) -> None:
        super().__init__(logging.WARNING)
        self.messages: list[str] = []

    def emit(self, record: logging.LogRecord) -> None:
        self.messages.append(record.getMessage())


@contextmanager
def quiet_renderer() -> Iterator[list[str]]:
    """Collects the renderer's warnings, which mean that it left a piece out and went on, instead of printing them."""
    collector = _Collector()
    loggers = [logging.getLogger(name) for name in ("weasyprint", "fontTools")]
    for logger in loggers:
        logger.addHandler(collector)
    try:
        with warnings.catch_warnings():
            # The renderer leaves the file of its colour profile to the garbage collector.
            warnings.filterwarnings("ignore", category=ResourceWarning, message=".*sRGB2014.icc.*")
            yield collector.messages
    finally:
        for logger in loggers:
            logger.removeHandler(collector)


@contextmanager
def _collected_rarely() -> Iterator[None]:
    """Fewer sweeps of the garbage collector: layout makes very many objects that all live until the end."""
    before = gc.get_threshold()
    gc.set_threshold(200_000, 50, 100)
    try:
        yield
    finally:
        gc.set_threshold(*before)
