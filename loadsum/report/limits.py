"""Bounds on what a hostile report can cost: how much it may hold, how long and in how much memory it is drawn."""

import signal
import sys
import threading
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from types import FrameType
from typing import Any

MOST_ROWS = 5_000  # in any one table
MOST_ENTRIES = 2_000_000  # numbers and texts in all
MOST_DAYS = 40_000  # of a calendar
DRAWING_S = 300.0
COMPUTING_S = 3600.0
MEMORY = 4 * 2**30  # beyond what the process holds at the start [byte]


class TakesTooLongError(Exception):
    """Drawing or computing went on beyond its bound."""


def too_much(results: Mapping[str, Any]) -> str:
    """What in some results is more than any report holds; empty where nothing is.

    Parameters
    ----------
    results : mapping
        Results as read from JSON that may come from anybody.
    """
    entries = 0
    waiting: list[tuple[str, Any]] = [("", results)]
    while waiting:
        where, value = waiting.pop()
        entries += 1
        if entries > MOST_ENTRIES:
            return f"more than {MOST_ENTRIES} entries"
        if isinstance(value, Mapping):
            waiting.extend((str(key)[:40], inner) for key, inner in value.items())
        elif isinstance(value, list):
            if len(value) > MOST_ROWS and where not in ("hours", "months", "findings") and isinstance(value[0], dict):
                return f"{len(value)} rows of {where}"
            waiting.extend((where, inner) for inner in value)
    calendar = results.get("quality")
    if isinstance(calendar, Mapping):
        runs = calendar.get("customers")
        lengths = [calendar.get("days")]
        for row in runs.values() if isinstance(runs, Mapping) else ():
            lengths.append(sum(run[0] for run in row if isinstance(run, list) and run and isinstance(run[0], int)))
        if any(isinstance(length, int | float) and length > MOST_DAYS for length in lengths):
            return f"a calendar of more than {MOST_DAYS} days"
    return ""


@contextmanager
def bounded(seconds: float) -> Iterator[None]:
    """Bounds time and memory of what is done inside, where the system can: on POSIX and in the main thread.

    Raises
    ------
    TakesTooLongError
        The time is over.
    MemoryError
        More memory was asked for than the bound allows.
    """
    if sys.platform == "win32" or threading.current_thread() is not threading.main_thread():
        yield
        return
    import resource

    def over(number: int, frame: FrameType | None) -> None:
        raise TakesTooLongError(f"stopped after {seconds:g} s")

    soft, hard = resource.getrlimit(resource.RLIMIT_AS)
    bound = _held() + MEMORY
    before = signal.signal(signal.SIGALRM, over)
    signal.setitimer(signal.ITIMER_REAL, seconds)
    if soft == resource.RLIM_INFINITY or soft > bound:
        resource.setrlimit(resource.RLIMIT_AS, (bound, hard))
    try:
        yield
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0.0)
        signal.signal(signal.SIGALRM, before)
        resource.setrlimit(resource.RLIMIT_AS, (soft, hard))


def _held() -> int:
    """Address space that the process holds; 0 where the system does not tell. [byte]"""
    try:
        pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[0])
    except OSError:
        return 0
    import resource

    return pages * resource.getpagesize()
