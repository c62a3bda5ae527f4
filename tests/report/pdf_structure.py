"""What PDF/A-3a and PDF/UA-1 ask of a report, as far as structure shows it; every fault as one sentence."""

import io
import itertools
import re
from collections.abc import Iterator
from typing import Any

import pikepdf
from fontTools.ttLib import TTFont
from pikepdf import Array, Dictionary, Name, Stream


def structure_faults(content: bytes) -> list[str]:
    """Faults of one PDF; empty when it holds what both standards ask of structure."""
    with pikepdf.open(io.BytesIO(content)) as pdf:
        faults = [
            *_document(pdf),
            *_metadata(pdf),
            *_attachments(pdf),
            *(fault for thing in pdf.objects for fault in _thing(thing)),
            *_headings(pdf),
            *_glyphs(pdf),
            *_content_is_marked(pdf),
        ]
    return sorted(set(faults))


def _document(pdf: Any) -> Iterator[str]:
    root = pdf.Root
    if "/ID" not in pdf.trailer:
        yield "the trailer has no /ID"
    if "/Encrypt" in pdf.trailer:
        yield "the file is encrypted"
    if not str(root.get("/Lang", "")):
        yield "the catalogue names no language"
    if not bool(root.get("/MarkInfo", Dictionary()).get("/Marked", False)):
        yield "the document is not marked as tagged"
    if not bool(root.get("/ViewerPreferences", Dictionary()).get("/DisplayDocTitle", False)):
        yield "the title is not displayed"
    intents = root.get("/OutputIntents", Array())
    if len(intents) != 1 or intents[0].S != Name.GTS_PDFA1 or "/DestOutputProfile" not in intents[0]:
        yield "no single archive output intent"
    if any("/Annots" in page and page.get("/Tabs") != Name.S for page in pdf.pages):
        yield "a page with links or fields does not say that they come in the order of the tags"
    if "/AA" in root or "/OpenAction" in root or "/JavaScript" in root.get("/Names", Dictionary()):
        yield "the catalogue has actions"
    form = root.get("/AcroForm", Dictionary())
    if "/NeedAppearances" in form or "/XFA" in form:
        yield "the form asks the viewer to draw"


def _metadata(pdf: Any) -> Iterator[str]:
    if "/Filter" in pdf.Root.Metadata:
        yield "metadata are packed"
    text = pdf.Root.Metadata.read_bytes().decode()
    if text.count("<rdf:RDF") != 1:
        yield "metadata needs exactly one rdf:RDF"
    body = text[text.index("<rdf:RDF") : text.index("</rdf:RDF>")]
    for wanted, what in (
        (r'pdfaid:part="3"', "PDF/A part"),
        (r'pdfaid:conformance="A"', "PDF/A conformance A"),
        (r'pdfuaid:part="1"', "PDF/UA part"),
        (r"pdfaExtension:schemas", "extension schema"),
        (r"<dc:title[ >]", "title"),
    ):
        if not re.search(wanted, body):
            yield f"metadata claims no {what}"


def _attachments(pdf: Any) -> Iterator[str]:
    listed = pdf.Root.get("/AF", Array())
    if len(listed) != len({entry.objgen for entry in listed}) or len(listed) != len(pdf.attachments):
        yield "each attachment is to be listed once among the associated files"
    names = [str(name) for name in pdf.Root.Names.EmbeddedFiles.Names[::2]] if len(listed) else []
    if names != sorted(names):
        yield "names of attachments are not in order"
    for entry in listed:
        if "/AFRelationship" not in entry or "/UF" not in entry or "/F" not in entry or "/Desc" not in entry:
            yield f"attachment {entry.get('/UF')} is not fully described"
        if "/Subtype" not in entry.EF.F:
            yield f"attachment {entry.get('/UF')} has no media type"


def _thing(thing: Any) -> Iterator[str]:
    if isinstance(thing, Stream) and thing.get("/Subtype") == Name.Image and bool(thing.get("/Interpolate", False)):
        yield "an image asks for interpolation"
    if not isinstance(thing, Dictionary):
        return
    if thing.get("/Type") == Name.Font and thing.get("/Subtype") != Name.Type0:
        descriptor = thing.get("/FontDescriptor", Dictionary())
        if not any(key in descriptor for key in ("/FontFile", "/FontFile2", "/FontFile3")):
            yield f"font {thing.get('/BaseFont')} is not embedded"
    if thing.get("/Type") == Name.Font and thing.get("/Subtype") == Name.Type0 and "/ToUnicode" not in thing:
        yield f"font {thing.get('/BaseFont')} cannot be read back as text"
    kind = thing.get("/S")
    if kind == Name.Figure and not str(thing.get("/Alt", "")):
        yield "a figure has no alternative text"
    if kind == Name.TH and "/Scope" not in thing.get("/A", Dictionary()):
        yield "a header cell has no scope"
    if kind == Name.L and not all(kid.S in (Name.LI, Name.L, Name.Caption) for kid in _kids(thing)):
        yield "a list holds other than items"
    if kind == Name.LI and not all(kid.S in (Name.Lbl, Name.LBody) for kid in _kids(thing)):
        yield "a list item holds other than label and body"
    if thing.get("/Subtype") == Name.Link and not ("/StructParent" in thing and str(thing.get("/Contents", ""))):
        yield "a link is not tagged or has no text"
    if thing.get("/Subtype") == Name.Widget:
        if "/StructParent" not in thing or not str(thing.get("/TU", "")) or "/AP" not in thing:
            yield "a field is not tagged, named and drawn"
        if not int(thing.get("/F", 0)) & 4:
            yield "a field is not printed"


def _kids(element: Any) -> list[Any]:
    kids = element.get("/K", Array())
    kids = kids if isinstance(kids, Array) else [kids]
    return [kid for kid in kids if isinstance(kid, Dictionary) and "/S" in kid]


def elements(pdf: Any) -> Iterator[tuple[Any, tuple[str, ...]]]:
    """Every structure element in reading order with the kinds of those around it."""

    def walk(thing: Any, around: tuple[str, ...]) -> Iterator[tuple[Any, tuple[str, ...]]]:
        if isinstance(thing, Array):
            for kid in thing:
                yield from walk(kid, around)
        elif isinstance(thing, Dictionary):
            yield thing, around
            if "/K" in thing and "/S" in thing:
                yield from walk(thing.K, (*around, str(thing.S)))

    yield from walk(pdf.Root.StructTreeRoot.K, ())


def _headings(pdf: Any) -> Iterator[str]:
    levels = []
    for element, around in elements(pdf):
        kind = str(element.get("/S", ""))
        if re.fullmatch("/H[1-6]", kind):
            levels.append(int(kind[2]))
        if element.get("/Type") == Name.OBJR and element.Obj.get("/Subtype") == Name.Link and around[-1] != "/Link":
            yield f"a link stands under {around[-1]}"
        if element.get("/Type") == Name.OBJR and element.Obj.get("/Subtype") == Name.Widget and around[-1] != "/Form":
            yield f"a field stands under {around[-1]}"
    if not levels or levels[0] != 1 or any(b > a + 1 for a, b in itertools.pairwise(levels)):
        yield f"heading levels skip: {levels}"


def _glyphs(pdf: Any) -> Iterator[str]:
    counts: dict[Any, int] = {}

    def last_glyph(font: Any) -> int:
        if font.objgen not in counts:
            file = font.DescendantFonts[0].FontDescriptor.get("/FontFile2")
            counts[font.objgen] = (
                0xFFFF if file is None else len(TTFont(io.BytesIO(file.read_bytes()), lazy=True).getGlyphOrder())
            )
        return counts[font.objgen]

    def walk(stream: Any, resources: Any) -> Iterator[str]:
        font = None
        for operands, operator in pikepdf.parse_content_stream(stream):
            if str(operator) == "Tf":
                font = resources.Font[str(operands[0])]
            elif str(operator) in ("Tj", "TJ") and font is not None:
                for piece in operands[0] if str(operator) == "TJ" else operands:
                    if isinstance(piece, pikepdf.String):
                        codes = bytes(piece)
                        for high, low in zip(codes[::2], codes[1::2], strict=True):
                            glyph = 256 * high + low
                            if glyph == 0 or glyph >= last_glyph(font):
                                yield "a glyph is missing from its font"
            elif str(operator) == "Do":
                inner = resources.XObject[str(operands[0])]
                if inner.get("/Subtype") == Name.Form:
                    yield from walk(inner, inner.get("/Resources", resources))

    for page in pdf.pages:
        yield from walk(page, page.Resources)


def _content_is_marked(pdf: Any) -> Iterator[str]:
    """Every drawing operator of a page stands inside tagged content or an artifact."""
    drawing = {"Tj", "TJ", "f", "F", "f*", "S", "s", "B", "b", "B*", "b*", "Do", "sh"}
    for number, page in enumerate(pdf.pages, start=1):
        depth = 0
        for operands, operator in pikepdf.parse_content_stream(page):
            name = str(operator)
            if name in ("BMC", "BDC"):
                depth += 1
                if depth > 1 and str(operands[0]) != "/Artifact":
                    yield f"page {number}: tagged content inside other marked content"
            elif name == "EMC":
                depth -= 1
            elif name in drawing and depth == 0:
                yield f"page {number}: {name} outside marked content"
