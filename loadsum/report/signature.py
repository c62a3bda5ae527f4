"""Signing an issued report with the engineer's own certificate, and judging the signatures of one that came back."""

import functools
import io
import logging
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

from loadsum.errors import Fault, InputError, MissingExtraError
from loadsum.report.received import Received, open_pdf, read_report, reading_faults
from loadsum.report.sections.sign_off import signers
from loadsum.report.stampfont import stamp_font
from loadsum.report.typeface import REGULAR, character_name, font_files


@dataclass(frozen=True, slots=True, kw_only=True)
class SignatureState:
    """One signature of a report.

    Parameters
    ----------
    field : str
        Signature field.
    signer : str
        Subject of the certificate.
    issuer : str
        Issuer of the certificate.
    time : str
        Time of signing as the signer's clock had it, ISO 8601; not proved by a time stamp.
    intact : bool
        Whether the bytes signed are those of the file, and the signature fits the certificate.
    covers_all : bool
        Whether nothing but later signatures was added after it.
    reason : str
        What is wrong; empty where nothing is.
    """

    field: str
    signer: str
    issuer: str
    time: str
    intact: bool
    covers_all: bool
    reason: str = ""

    @property
    def good(self) -> bool:
        """Whether it stands."""
        return self.intact and self.covers_all


def sign(content: bytes, *, role: str, certificate: bytes, passphrase: str) -> bytes:
    """A report with one more signature (PAdES B-B), the earlier bytes unchanged before it.

    Parameters
    ----------
    content : bytes
        The report.
    role : str
        Role of the signer in the study, as in the sign-off block, or the name of the signature field.
    certificate : bytes
        PKCS#12 file with the signer's key and certificate.
    passphrase : str
        Passphrase of that file; ask for it, never take it from the command line.

    Raises
    ------
    InputError
        The report is not issued, has no such field, is signed there already, was altered after an earlier signature,
        or the certificate cannot be opened.
    MissingExtraError
        The signing package is not installed.
    """
    try:
        from pyhanko.pdf_utils.text import TextBoxStyle
        from pyhanko.sign import signers as pdf_signers
        from pyhanko.sign.fields import SigSeedSubFilter
        from pyhanko.sign.general import SigningError
        from pyhanko.stamp import TextStampStyle
    except ImportError as error:
        raise MissingExtraError("signing a report", "sign") from error
    report = read_report(content)
    field = _field_for(report, role)
    engineer = _signer(certificate, passphrase)
    text = _stamp_text(_subject(engineer.signing_cert))
    style = TextStampStyle(
        stamp_text=text,
        timestamp_format="%Y-%m-%d %H:%M %Z",
        border_width=0,
        background=None,
        text_box_style=TextBoxStyle(font=stamp_font(_font_for(text), 9), font_size=9, leading=12),
    )
    about = pdf_signers.PdfSignatureMetadata(
        field_name=field, md_algorithm="sha256", subfilter=SigSeedSubFilter.PADES, name=_subject(engineer.signing_cert)
    )
    target = io.BytesIO()
    try:
        with warnings.catch_warnings():
            # The library leaves the font file to the garbage collector.
            warnings.filterwarnings("ignore", category=ResourceWarning, message=r".*\.ttf.*")
            pdf_signers.PdfSigner(about, signer=engineer, stamp_style=style).sign_pdf(
                _plain_writer()(io.BytesIO(content)), existing_fields_only=True, output=target
            )
    except SigningError as error:
        raise InputError("report", [Fault(field, f"cannot be signed: {error}")]) from error
    signed = target.getvalue()
    if not signed.startswith(content):
        raise ValueError("signing changed bytes that were there before")
    return signed


@functools.cache
def _plain_writer() -> Any:
    """The library's writer, which leaves the metadata of the report as they are.

    The library would write them anew in a form that says the same to an RDF reader but not to every archive validator,
    and the time of signing stands in the signature anyway.
    """
    from pyhanko.pdf_utils.incremental_writer import IncrementalPdfFileWriter

    class PlainWriter(IncrementalPdfFileWriter):
        def _update_meta(self) -> None:
            return

    return PlainWriter


def _field_for(report: Received, role: str) -> str:
    """The empty signature field of a role."""
    results = report.results
    if results is None:
        raise InputError("report", [Fault("results.json", "is not attached; only a report of this program is signed")])
    status = (results.get("study") or {}).get("status")
    if status != "issued":
        raise InputError(
            "report",
            [Fault("study.status", f'is "{status}"; only an issued report is signed, so issue it and draw it again')],
        )
    states = signatures(report)
    for state in states:
        if not state.good:
            raise InputError("report", [Fault(state.field, f"earlier signature does not stand: {state.reason}")])
    known = dict(signers(results))
    matching = [name for name, person in known.items() if role in (name, person.get("role"))]
    done = {state.field for state in states}
    open_fields = [name for name in matching if name in report.fields and name not in done]
    if not matching or not set(matching) & set(report.fields):
        roles = ", ".join(sorted({str(person.get("role")) for person in known.values()}))
        raise InputError("report", [Fault("role", f'no signature field for "{role}"; the report has: {roles}')])
    if not open_fields:
        raise InputError("report", [Fault("role", f'"{role}" has signed already')])
    return open_fields[0]


def _signer(certificate: bytes, passphrase: str) -> Any:
    from pyhanko.sign.signers import SimpleSigner

    try:
        return SimpleSigner.load_pkcs12_data(certificate, other_certs=[], passphrase=passphrase.encode())
    except ValueError as error:
        raise InputError(
            "certificate", [Fault("file", "cannot be opened: wrong passphrase, or not a PKCS#12 file")]
        ) from error


def _subject(certificate: Any) -> str:
    subject = certificate.subject.native
    return str(subject.get("common_name") or certificate.subject.human_friendly)


def _stamp_text(name: str) -> str:
    """What is printed in the field: who, and the time as a blank that the stamp fills."""
    return name[:60].replace("%", "%%") + "\nsigned %(ts)s"


def _font_for(text: str) -> Any:
    """The first shipped font that can print a text whole."""
    from fontTools.ttLib import TTFont

    for path in (REGULAR, font_files()[2]):
        with TTFont(path, lazy=True) as font:
            known = font.getBestCmap()
            missing = [c for c in text if c != "\n" and ord(c) not in known]
        if not missing:
            return path
    raise InputError(
        "certificate",
        [
            Fault("subject", f"character {character_name(c)} is in no font of the report")
            for c in dict.fromkeys(missing)
        ],
    )


def signatures(report: Received) -> Sequence[SignatureState]:
    """Every signature of a report, in the order they were made.

    Parameters
    ----------
    report : Received
        The report.

    Raises
    ------
    InputError
        The file is damaged.
    """
    reader = open_pdf(report.content, "report")
    try:
        embedded = list(reader.embedded_signatures)
    except reading_faults() as error:
        raise InputError("report", [Fault("signatures", f"cannot be read: {type(error).__name__}")]) from error
    quick = [_judge(signature, report.content, last=True, compare=False) for signature in embedded]
    if not all(state.intact for state in quick):
        return quick
    return [
        _judge(signature, report.content, last=n == len(embedded) - 1, compare=True)
        for n, signature in enumerate(embedded)
    ]


def _judge(signature: Any, content: bytes, *, last: bool, compare: bool) -> SignatureState:
    """State of one signature; ``compare`` looks into what was added after it."""
    from pyhanko.sign.diff_analysis import ModificationLevel
    from pyhanko.sign.general import UnacceptableSignerError
    from pyhanko.sign.validation import validate_pdf_signature
    from pyhanko.sign.validation.errors import SignatureValidationError
    from pyhanko.sign.validation.status import SignatureCoverageLevel
    from pyhanko_certvalidator import ValidationContext

    faults: tuple[type[Exception], ...] = (SignatureValidationError, UnacceptableSignerError, *reading_faults())
    try:
        with _no_talk_of_trust():
            status = validate_pdf_signature(
                signature, ValidationContext(trust_roots=[], allow_fetching=False), skip_diff=not compare
            )
    except faults as error:
        return SignatureState(
            field=str(signature.field_name),
            signer="",
            issuer="",
            time="",
            intact=False,
            covers_all=False,
            reason=f"cannot be read: {type(error).__name__}: {str(error)[:160]}",
        )
    certificate = status.signing_cert
    intact = bool(status.intact and status.valid) and _written_plainly(content, signature.byte_range)
    whole = status.coverage == SignatureCoverageLevel.ENTIRE_FILE
    later = (
        status.coverage == SignatureCoverageLevel.ENTIRE_REVISION
        and status.modification_level is not None
        and status.modification_level <= ModificationLevel.FORM_FILLING
    )
    covers = whole or (later and not last)
    reason = (
        ""
        if intact and covers
        else (
            "bytes that were signed have changed"
            if not intact
            else "something other than a signature was added afterwards"
        )
    )
    return SignatureState(
        field=str(signature.field_name),
        signer=_subject(certificate),
        issuer=str(certificate.issuer.human_friendly),
        time=status.signer_reported_dt.isoformat() if status.signer_reported_dt else "",
        intact=intact,
        covers_all=covers,
        reason=reason,
    )


def _written_plainly(content: bytes, byte_range: Any) -> bool:
    """Whether the gap that a signature leaves for itself holds the signature and zeros, in capital digits.

    No signature covers its own gap, so spare bytes there, or the case of a digit, could be changed unseen.
    """
    _, first, second, _ = (int(place) for place in byte_range)
    gap = content[first:second]
    if gap[:1] != b"<" or gap[-1:] != b">":
        return False
    try:
        der = bytes.fromhex(gap[1:-1].decode("ascii"))
    except ValueError:
        return False
    if der.hex().upper().encode() != gap[1:-1] or len(der) < 4 or der[0] != 0x30:
        return False
    long_form = der[1] & 0x80
    head = 2 + (der[1] & 0x7F) if long_form else 2
    length = int.from_bytes(der[2:head], "big") if long_form else der[1]
    return not any(der[head + length :])


@contextmanager
def _no_talk_of_trust() -> Iterator[None]:
    """The library logs that it knows no issuer to trust; whom to trust is the reader's own question."""
    logger = logging.getLogger("pyhanko")
    before = logger.level
    logger.setLevel(logging.CRITICAL + 1)
    try:
        yield
    finally:
        logger.setLevel(before)
