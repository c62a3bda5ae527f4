"""What a section of the report is made from: cleaned results, the catalogue, the notation, and nothing else."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from loadsum.report.notation import NO_BREAK, Notation
from loadsum.report.templates import Catalogue


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """One section of the report.

    Parameters
    ----------
    block : str
        Name of the block template that prints it.
    title : str
        Heading.
    content : mapping
        What the block template prints.
    figures : tuple of str
        Names of the figures it shows.
    unit : int
        Transformer it is about, from 0; -1 where it is about the whole study. [-]
    """

    block: str
    title: str
    content: Mapping[str, Any]
    figures: tuple[str, ...] = ()
    unit: int = -1

    @property
    def anchor(self) -> str:
        """Name of the section inside the document."""
        return self.block if self.unit < 0 else f"{self.block}-{self.unit + 1}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Unit:
    """One transformer of the study.

    Parameters
    ----------
    index : int
        Position in the study, from 0. [-]
    several : bool
        Whether the study has more than one.
    results : mapping
        Results of this transformer over those that are common to the study.
    """

    index: int
    several: bool
    results: Mapping[str, Any]

    @property
    def id(self) -> str:
        """Asset number as printed."""
        return str(self.results.get("id") or f"no. {self.index + 1}")

    def part(self, name: str) -> Any:
        """A part of the results; None where it is missing or empty."""
        return self.results.get(name) or None

    def rows(self, name: str) -> Sequence[Mapping[str, Any]]:
        """A list of the results; empty where it is missing."""
        return self.results.get(name) or ()

    def figure(self, name: str) -> str:
        """Name of a figure of this transformer."""
        return f"{name}-{self.index + 1}" if self.several else name


@dataclass(frozen=True, slots=True, kw_only=True)
class Material:
    """Results as they may be printed, with the words and the notation to print them in.

    Parameters
    ----------
    results : mapping
        Cleaned results; a key that is missing or null leaves its section out.
    t : Catalogue
        Sentences.
    n : Notation
        Numbers and dates.
    """

    results: Mapping[str, Any]
    t: Catalogue
    n: Notation

    def part(self, name: str) -> Any:
        """A top-level part of the results; None where it is missing or empty."""
        return self.results.get(name) or None

    def rows(self, name: str) -> Sequence[Mapping[str, Any]]:
        """A top-level list of the results; empty where it is missing."""
        return self.results.get(name) or ()

    @property
    def study(self) -> Mapping[str, Any]:
        """The study's heading."""
        return self.results.get("study") or {}

    @property
    def units(self) -> Sequence[Unit]:
        """Every transformer of the study; one made of the top level where none is listed apart."""
        listed = self.results.get("transformers") or [{}]
        common = {name: value for name, value in self.results.items() if name != "transformers"}
        return tuple(
            Unit(
                index=index,
                several=len(listed) > 1,
                results={**common, **{name: value for name, value in one.items() if value is not None}},
            )
            for index, one in enumerate(listed)
        )

    @property
    def interval_min(self) -> int:
        """Demand interval. [min]"""
        return int(self.study.get("demand_interval_min") or 60)

    def kva(self, value: float | None) -> str:
        """A rating, ``37.5 kVA``."""
        return self.plain(value) + NO_BREAK + "kVA"

    def plain(self, value: float | None, most_places: int = 3) -> str:
        """A number given by the user, with the decimals it was given with."""
        if value is None:
            return self.n.none
        text = f"{value:.{most_places}f}".rstrip("0").rstrip(".")
        return self.n.fixed(value, len(text.partition(".")[2]))

    @property
    def fahrenheit(self) -> bool:
        """Whether temperatures are printed in °F."""
        return str(self.study.get("temperature_unit") or "C") == "F"

    def temperature(self, celsius: float | None, places: int = 0) -> str:
        """A temperature in the study's unit."""
        if celsius is None:
            return self.n.none
        value = celsius * 1.8 + 32.0 if self.fahrenheit else celsius
        return self.n.fixed(value, places) + NO_BREAK + ("°F" if self.fahrenheit else "°C")

    def hours(self, value: float | None) -> str:
        """Hours per year without the unit: two significant digits below 10, whole hours above."""
        if value is None:
            return self.n.none
        if value < 0.01:
            return "<" + NO_BREAK + self.n.fixed(0.01, 2) if value > 0 else "0"
        return self.n.significant(value, 2) if value < 9.95 else self.n.fixed(value)

    def between(self, low: float | None, high: float | None, form: Any) -> str:
        """An interval, ``0.7 to 2.1``; the sign for "not known" where there is none."""
        if low is None or high is None:
            return self.n.none
        return self.t("word.from_to", low=form(low), high=form(high))

    def hour_class(self, place: Mapping[str, Any] | None) -> str:
        """A class of time in words, ``winter, workday, 19:00``."""
        if not place:
            return self.n.none
        return ", ".join(str(place[k]) for k in ("season", "day_type", "starts") if place.get(k))
