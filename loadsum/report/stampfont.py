"""The font of a signature's stamp, embedded so that its letters can be read back one by one."""

import functools
import io
import re
from pathlib import Path
from typing import Any


@functools.cache
def _kinds() -> tuple[Any, Any]:
    """The library's font engine and its factory, with a plainer table of what each code reads as.

    The library writes neighbouring codes as ranges with a list of letters, which is allowed but which not every
    validator reads.
    """
    from pyhanko.pdf_utils.font.opentype import GlyphAccumulator, GlyphAccumulatorFactory
    from pyhanko.pdf_utils.generic import StreamObject

    class ListedLetters(GlyphAccumulator):
        def _format_tounicode_cmap(self) -> Any:
            table: Any = super()
            stream: Any = StreamObject(stream_data=letter_by_letter(table._format_tounicode_cmap().data))
            stream.compress()
            return stream

    class Factory(GlyphAccumulatorFactory):
        def create_font_engine(self, writer: Any, obj_stream: Any = None) -> Any:
            if obj_stream is None and writer.stream_xrefs and self.create_objstream_if_needed:
                obj_stream = writer.prepare_object_stream()
            file = io.BytesIO(Path(self.font_file).read_bytes())
            return ListedLetters(writer=writer, font_handle=file, font_size=self.font_size, obj_stream=obj_stream)

    return ListedLetters, Factory


def stamp_font(path: Path, size_pt: int) -> Any:
    """Font of a stamp for the signing library.

    Parameters
    ----------
    path : Path
        TrueType file.
    size_pt : int
        Size. [pt]
    """
    return _kinds()[1](str(path), font_size=size_pt)


def letter_by_letter(table: bytes) -> bytes:
    """A ToUnicode table whose ranges with lists of letters are written out, a hundred lines a block at most."""

    def listed(block: re.Match[bytes]) -> bytes:
        lines = [
            b"<%04x> %s" % (int(first, 16) + place, letter)
            for first, letters in re.findall(rb"<(\w+)> <\w+> \[([^\]]*)\]", block[1])
            for place, letter in enumerate(letters.split())
        ]
        blocks = [lines[start : start + 100] for start in range(0, len(lines), 100)]
        return b"\n".join(b"%d beginbfchar\n%s\nendbfchar" % (len(part), b"\n".join(part)) for part in blocks)

    return re.sub(rb"\d+ beginbfrange(.*?)endbfrange", listed, table, flags=re.DOTALL)
