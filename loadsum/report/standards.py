"""Last hand on the PDF before it is written: what PDF/A-3a and PDF/UA-1 ask beyond what the renderer does."""

from typing import Any

import pydyf

# Media types by ending; the machine's own tables would differ from one to the next.
MEDIA_TYPES = {
    ".toml": "text/plain",
    ".json": "application/json",
    ".csv": "text/csv",
    ".txt": "text/plain",
    ".svg": "image/svg+xml",
}

UA_DESCRIPTION = (
    '<rdf:Description xmlns:pdfuaid="http://www.aiim.org/pdfua/ns/id/" rdf:about="" pdfuaid:part="1" />'
    '<rdf:Description xmlns:pdfaExtension="http://www.aiim.org/pdfa/ns/extension/"'
    ' xmlns:pdfaSchema="http://www.aiim.org/pdfa/ns/schema#"'
    ' xmlns:pdfaProperty="http://www.aiim.org/pdfa/ns/property#" rdf:about="">'
    "<pdfaExtension:schemas><rdf:Bag>"
    '<rdf:li rdf:parseType="Resource">'
    "<pdfaSchema:schema>PDF/UA identification schema</pdfaSchema:schema>"
    "<pdfaSchema:namespaceURI>http://www.aiim.org/pdfua/ns/id/</pdfaSchema:namespaceURI>"
    "<pdfaSchema:prefix>pdfuaid</pdfaSchema:prefix>"
    '<pdfaSchema:property><rdf:Seq><rdf:li rdf:parseType="Resource">'
    "<pdfaProperty:name>part</pdfaProperty:name>"
    "<pdfaProperty:valueType>Integer</pdfaProperty:valueType>"
    "<pdfaProperty:category>internal</pdfaProperty:category>"
    "<pdfaProperty:description>Part of ISO 14289 that the document follows</pdfaProperty:description>"
    "</rdf:li></rdf:Seq></pdfaSchema:property>"
    "</rdf:li></rdf:Bag></pdfaExtension:schemas></rdf:Description>"
)


def meet_both_standards(document: Any, pdf: Any) -> None:
    """Finisher for the renderer: archive and accessibility at once, empty signature fields, running titles set aside.

    Parameters
    ----------
    document : weasyprint.Document
        The laid-out document.
    pdf : pydyf.PDF
        The PDF, changed in place.
    """
    _claim_accessibility(pdf)
    _list_each_attachment_once(pdf)
    _state_media_types(pdf)
    _give_headers_a_scope(document)
    _name_links_by_their_text(document)
    _empty_signature_fields(pdf)
    _set_running_titles_aside(pdf)


def _dictionaries(pdf: Any, kind: str, value: str) -> list[Any]:
    return [o for o in pdf.objects if isinstance(o, dict) and o.get(kind) == value]


def _object(pdf: Any, reference: bytes | str) -> Any:
    text = reference.decode() if isinstance(reference, bytes) else reference
    return pdf.objects[int(text.split()[0])]


def _claim_accessibility(pdf: Any) -> None:
    """Write the PDF/UA claim and its extension schema inside the one rdf:RDF that PDF/A allows."""
    stream = _object(pdf, pdf.catalog["Metadata"])
    whole = b"".join(part if isinstance(part, bytes) else part.encode() for part in stream.stream)
    head, end, tail = whole.partition(b"</rdf:RDF>")
    if not end:
        raise ValueError("the renderer's metadata has no rdf:RDF to extend")
    stream.stream = [head + UA_DESCRIPTION.encode() + end + tail]
    stream.compress = False  # an archive wants metadata that can be read without unpacking


def _list_each_attachment_once(pdf: Any) -> None:
    if "AF" in pdf.catalog:
        pdf.catalog["AF"] = pydyf.Array(dict.fromkeys(pdf.catalog["AF"]))


def _state_media_types(pdf: Any) -> None:
    for entry in _dictionaries(pdf, "Type", "/Filespec"):
        name = entry["UF"].string
        kind = MEDIA_TYPES.get("." + name.rpartition(".")[2], "application/octet-stream")
        _object(pdf, entry["EF"]["F"]).extra["Subtype"] = "/" + kind.replace("/", "#2f").replace("+", "#2b")


def _give_headers_a_scope(document: Any) -> None:
    for page in document.pages:
        for box in page._page_box.descendants():
            element = getattr(box, "mark", None)
            if element is not None and element["S"] == "/TH":
                element["A"]["Scope"] = "/Row" if box.element.attrib.get("scope") == "row" else "/Column"


def _name_links_by_their_text(document: Any) -> None:
    for page in document.pages:
        for kind, _, _, box in page.links:
            if kind in ("internal", "external") and box.link_annotation is not None:
                text = " ".join("".join(box.element.itertext()).split())
                box.link_annotation["Contents"] = pydyf.String(text)


def _empty_signature_fields(pdf: Any) -> None:
    """Turn the check boxes of the sign-off block into signature fields with an empty appearance."""
    form = pdf.catalog.get("AcroForm")
    if form is None:
        return
    form.pop("NeedAppearances", None)
    form.pop("DR", None)
    for reference in form["Fields"]:
        field = _object(pdf, reference)
        appearance = _object(pdf, next(iter(field["AP"]["N"].values())))
        appearance.stream = []
        appearance.extra.pop("Resources", None)
        for name in ("V", "AS", "MK", "Border", "DA", "Opt", "Ff"):
            field.pop(name, None)
        field["FT"] = "/Sig"
        field["F"] = 4
        field["AP"] = pydyf.Dictionary({"N": appearance.reference})
    for element in _dictionaries(pdf, "S", "/Form"):
        element["K"] = element["K"][0]


def _set_running_titles_aside(pdf: Any) -> None:
    """Mark running titles and page numbers as pagination, which a screen reader leaves out."""
    root = _object(pdf, pdf.catalog["StructTreeRoot"])
    reached: set[int] = set()
    waiting = [_number(r) for r in root["K"]]
    while waiting:
        number = waiting.pop()
        if number in reached:
            continue
        reached.add(number)
        element = pdf.objects[number]
        kids = element.get("K", []) if isinstance(element, dict) else []
        for kid in kids if isinstance(kids, list) else [kids]:
            if isinstance(kid, bytes | str):
                waiting.append(_number(kid))
    numbers = _object(pdf, root["ParentTree"])["Nums"]
    pages = [pdf.objects[n] for n in pdf.pages["Kids"][::3]]
    for page_index, owners in zip(numbers[::2], numbers[1::2], strict=True):
        if not isinstance(owners, list):
            continue
        outside = {mcid for mcid, owner in enumerate(owners) if _number(owner) not in reached}
        _mark_as_pagination(_object(pdf, pages[page_index]["Contents"]), outside)
        for mcid in outside:
            owners[mcid] = "null"
    for element in _dictionaries(pdf, "Type", "/StructElem"):
        if element.number not in reached:
            element.clear()  # deleting it would shift the writer's cross-reference table


def _number(reference: bytes | str) -> int:
    return int(reference.split()[0])


def _mark_as_pagination(stream: Any, mcids: set[int]) -> None:
    content = stream.stream
    for position, item in enumerate(content):
        if isinstance(item, dict) and item.get("MCID") in mcids:
            content[position - 1] = "/Artifact"
            content[position] = pydyf.Dictionary({"Type": "/Pagination"})
