"""The words of a PDF in the order of its tags, as a screen reader says them."""

import io
import re
from typing import Any

import pikepdf
from pikepdf import Array, Dictionary, Name


def tagged_words(content: bytes) -> list[str]:
    """Words of every tagged text in the order of the tag tree; artifacts and what stands in drawings are left out."""
    with pikepdf.open(io.BytesIO(content)) as pdf:
        pieces = {page.objgen: _marked(page) for page in pdf.pages}
        said: list[str] = []

        def walk(kid: Any, page: Any) -> None:
            if isinstance(kid, Array):
                for one in kid:
                    walk(one, page)
            elif isinstance(kid, Dictionary):
                inner = kid.get("/Pg", page)
                if kid.get("/Type") == Name.MCR:
                    said.append(pieces[inner.objgen].get(int(kid.MCID), ""))
                elif "/S" in kid and "/K" in kid:
                    walk(kid.K, inner)
                    said.append(" ")
            elif page is not None:
                said.append(pieces[page.objgen].get(int(kid), ""))

        walk(pdf.Root.StructTreeRoot.K, None)
    return "".join(said).split()


def _marked(page: Any) -> dict[int, str]:
    """Text by number of marked content, in the order it is drawn."""
    found: dict[int, str] = {}
    around: list[int | None] = []
    letters: dict[int, str] = {}
    for operands, operator in pikepdf.parse_content_stream(page):
        name = str(operator)
        if name in ("BMC", "BDC"):
            inner = operands[1] if name == "BDC" and isinstance(operands[1], Dictionary) else Dictionary()
            around.append(int(inner.MCID) if "/MCID" in inner else None)
        elif name == "EMC":
            around.pop()
        elif name == "Tf":
            letters = _letters(page.Resources.Font[str(operands[0])])
        elif name in ("Tj", "TJ") and around and around[-1] is not None:
            for piece in operands[0] if name == "TJ" else operands:
                if isinstance(piece, pikepdf.String):
                    codes = bytes(piece)
                    text = "".join(letters.get(256 * a + b, "") for a, b in zip(codes[::2], codes[1::2], strict=True))
                    found[around[-1]] = found.get(around[-1], "") + text
        elif name in ("ET",) and around and around[-1] is not None:
            found[around[-1]] = found.get(around[-1], "") + " "
    return found


def _letters(font: Any) -> dict[int, str]:
    """What each code of a font reads as, from its own table."""
    table = font.ToUnicode.read_bytes().decode("latin-1")
    found: dict[int, str] = {}
    for block in re.findall(r"beginbfchar(.*?)endbfchar", table, re.S):
        for code, text in re.findall(r"<(\w+)>\s*<(\w+)>", block):
            found[int(code, 16)] = bytes.fromhex(text).decode("utf-16-be")
    for block in re.findall(r"beginbfrange(.*?)endbfrange", table, re.S):
        for first, last, text in re.findall(r"<(\w+)>\s*<(\w+)>\s*<(\w+)>", block):
            for code in range(int(first, 16), int(last, 16) + 1):
                found[code] = chr(int(text, 16) + code - int(first, 16))
    return found
