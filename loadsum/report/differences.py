"""What differs between two results, value by value."""

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

TOLERANCE = 1e-9
# Parts that say what made the results and not what was found.
ABOUT = frozenset({"program", "schema_version"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference:
    """One value that is not the same.

    Parameters
    ----------
    where : str
        Dotted key of the results.
    attached, recomputed : object
        The value in the report and the one computed now; None where one side has none.
    """

    where: str
    attached: Any
    recomputed: Any

    def __str__(self) -> str:
        return f"{self.where}: {_short(self.attached)} in the report, {_short(self.recomputed)} recomputed"


def differences(
    attached: Mapping[str, Any], recomputed: Mapping[str, Any], tolerance: float = TOLERANCE
) -> Sequence[Difference]:
    """Every value that differs by more than the tolerance.

    Parameters
    ----------
    attached, recomputed : mapping
        Results as read from JSON.
    tolerance : float
        Relative difference of two numbers that still counts as the same; numbers computed on another processor agree
        to it. [-]
    """
    return [
        found
        for name in dict.fromkeys([*attached, *recomputed])
        if name not in ABOUT
        for found in _walk(attached.get(name), recomputed.get(name), name, tolerance)
    ]


def _walk(a: Any, b: Any, where: str, tolerance: float) -> Iterator[Difference]:
    if isinstance(a, Mapping) and isinstance(b, Mapping):
        for name in dict.fromkeys([*a, *b]):
            yield from _walk(a.get(name), b.get(name), f"{where}.{name}", tolerance)
    elif isinstance(a, list) and isinstance(b, list):
        if len(a) != len(b):
            yield Difference(where=f"{where} (length)", attached=len(a), recomputed=len(b))
        for index, (x, y) in enumerate(zip(a, b, strict=False)):
            yield from _walk(x, y, f"{where}[{index}]", tolerance)
    elif not _same(a, b, tolerance):
        yield Difference(where=where, attached=a, recomputed=b)


def _same(a: Any, b: Any, tolerance: float) -> bool:
    numbers = (int, float)
    if isinstance(a, numbers) and isinstance(b, numbers) and not isinstance(a, bool) and not isinstance(b, bool):
        return math.isclose(a, b, rel_tol=tolerance, abs_tol=tolerance * 1e-6)
    return type(a) is type(b) and bool(a == b)


def _short(value: Any) -> str:
    text = repr(value) if isinstance(value, int | float | str) or value is None else type(value).__name__
    return "nothing" if value is None else text if len(text) <= 60 else text[:59] + "…"
