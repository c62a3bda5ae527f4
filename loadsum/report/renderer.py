"""The PDF renderer and the system libraries under it: loaded once, and known to the version."""

import functools
import zlib
from importlib import metadata
from typing import Any

from loadsum.errors import MachineError
from loadsum.report.typeface import shipped_fonts_only

LIBRARIES = "apt-get install --no-install-recommends libpango-1.0-0 libpangoft2-1.0-0 libharfbuzz-subset0"
PACKAGES = ("weasyprint", "pydyf", "fonttools", "matplotlib", "numpy", "jinja2", "tinyhtml5", "tinycss2")


def load() -> Any:
    """The renderer's module.

    Raises
    ------
    MachineError
        The text-layout libraries are missing; the message has the line that installs them.
    """
    with shipped_fonts_only():
        try:
            import weasyprint
        except OSError as error:
            raise MachineError(
                f"the PDF renderer needs system libraries ({error}); install them: {LIBRARIES}"
            ) from error
    return weasyprint


@functools.cache
def versions() -> dict[str, str]:
    """Versions of everything that decides how the pages come out to the byte.

    Raises
    ------
    MachineError
        The text-layout libraries are missing.
    """
    load()
    from weasyprint.text.ffi import harfbuzz, harfbuzz_subset, pango

    number = int(pango.pango_version())
    return {
        **{name: metadata.version(name) for name in PACKAGES},
        "harfbuzz": _harfbuzz_version(harfbuzz),
        "harfbuzz-subset": "present" if harfbuzz_subset else "absent",
        "pango": f"{number // 10000}.{number // 100 % 100}.{number % 100}",
        "zlib": zlib.ZLIB_RUNTIME_VERSION,
    }


def _harfbuzz_version(library: Any) -> str:
    """The version of the library, which only answers whether it is at least one asked."""
    found = [0, 0, 0]
    for place in range(3):
        while found[place] < 999:
            found[place] += 1
            if not library.hb_version_atleast(*found):
                found[place] -= 1
                break
    return ".".join(str(part) for part in found)
