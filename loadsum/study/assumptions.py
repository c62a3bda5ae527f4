"""What a study takes as given, value by value, with its source."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Assumption:
    """One value that the study rests on and did not compute.

    Parameters
    ----------
    name : str
        What it is.
    value : str
        Its value as printed.
    unit : str
        Its unit; empty for a word or a plain number.
    source : str
        Where it comes from.
    decided_by : str
        "study file", "program default", or a name.
    effect : str
        What the verdict does if it moves; empty where that was not computed.
    """

    name: str
    value: str
    unit: str = ""
    source: str
    decided_by: str
    effect: str = ""
