"""Numbers and dates as they are printed in a place."""

import datetime as dt
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

THIN_SPACE = "\u2009"
NO_BREAK = "\u00a0"
MINUS = "\u2212"


@dataclass(frozen=True, slots=True, kw_only=True)
class Notation:
    """How numbers and dates are printed.

    Parameters
    ----------
    decimal : str
        Decimal sign.
    group : str
        Sign between groups of three digits from 10 000 on.
    date_form : str
        Form of a date with ``{day}``, ``{month}``, ``{month_number:02d}`` and ``{year}``.
    months : sequence of str
        Names of the twelve months.
    none : str
        What stands for a number that is not known.
    """

    decimal: str
    group: str
    date_form: str
    months: Sequence[str]
    none: str

    @classmethod
    def from_catalogue(cls, table: Mapping[str, Any], months: Sequence[str], none: str) -> "Notation":
        """Notation from a table of the text catalogue."""
        return cls(
            decimal=str(table["decimal"]),
            group=str(table["group"]),
            date_form=str(table["date"]),
            months=tuple(months),
            none=none,
        )

    def fixed(self, value: float | None, places: int = 0) -> str:
        """A number with a fixed number of decimals."""
        if value is None or not math.isfinite(value):
            return self.none
        text = f"{abs(value):.{places}f}"
        sign = MINUS if value < 0 and float(text) != 0.0 else ""
        whole, _, fraction = text.partition(".")
        if len(whole) > 4:
            head = len(whole) % 3
            parts = ([whole[:head]] if head else []) + [whole[i : i + 3] for i in range(head, len(whole), 3)]
            whole = self.group.join(parts)
        return sign + whole + (self.decimal + fraction if fraction else "")

    def significant(self, value: float | None, digits: int = 3) -> str:
        """A number to so many significant digits, never in exponent form between 1e-4 and 1e7."""
        if value is None or not math.isfinite(value):
            return self.none
        if value == 0.0:
            return "0"
        power = math.floor(math.log10(abs(value)))
        rounded = round(value, digits - 1 - power)
        power = math.floor(math.log10(abs(rounded))) if rounded else power
        if power < -4:
            return self.scientific(value, digits)
        return self.fixed(rounded, max(digits - 1 - power, 0))

    def scientific(self, value: float, digits: int = 2) -> str:
        """A number as ``1.2 × 10⁻⁵``."""
        mantissa, _, power = f"{abs(value):.{digits - 1}e}".partition("e")
        raised = str(int(power)).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
        return (MINUS if value < 0 else "") + mantissa.replace(".", self.decimal) + f"{NO_BREAK}×{NO_BREAK}10{raised}"

    def percent(self, share: float | None, digits: int = 2) -> str:
        """A share as a percentage to so many significant digits."""
        if share is None or not math.isfinite(share):
            return self.none
        return self.significant(100.0 * share, digits) + NO_BREAK + "%"

    def probability(self, value: float | None, floor: float | None = None) -> str:
        """A probability as a percentage, ``< floor`` where the record supports no figure so small."""
        if value is None or not math.isfinite(value):
            return self.none
        if floor and value < floor:
            return "<" + NO_BREAK + self.percent(floor, 1)
        return self.percent(value)

    def date(self, text: str | None) -> str:
        """A date given in ISO 8601."""
        if not text:
            return self.none
        try:
            day = dt.date.fromisoformat(text[:10])
        except ValueError:
            return text
        return self.date_form.format(
            day=day.day, month=self.months[day.month - 1], month_number=day.month, year=day.year, day_number=day.day
        )
