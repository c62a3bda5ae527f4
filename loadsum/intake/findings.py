"""What intake has to say about the readings: doubts as values, never silent repairs."""

from dataclasses import dataclass
from typing import Literal

Severity = Literal["note", "caution", "excluded"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One rule that fired, where, how often, and what was done.

    Parameters
    ----------
    rule : str
        Name of the rule, as documented in docs/findings.md.
    severity : {"note", "caution", "excluded"}
        ``excluded``: the readings counted here are not used.
    customer : str
        Identifier of the customer; empty where the finding is about a file or about all.
    place : str
        ``file:line``, or the first interval, as the user would look for it.
    count : int
        Readings concerned. [-]
    excluded : int
        Readings left out because of it, each reading under one finding only. [-]
    message : str
        What was found.
    effect : str
        What this did to the study.
    """

    rule: str
    severity: Severity
    customer: str = ""
    place: str = ""
    count: int = 0
    excluded: int = 0
    message: str
    effect: str = ""
