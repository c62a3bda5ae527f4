"""What the user sees while a long run works."""

import sys
from typing import Protocol, TextIO


class Progress(Protocol):
    """Told where a run stands."""

    def __call__(self, stage: str, done: float) -> None:
        """Say that a stage is on, and what share of it is done, 0 to 1."""


def silent(stage: str, done: float) -> None:
    """Say nothing."""


class TerminalLine:
    """One line on a terminal that is rewritten in place and leaves no trace; nothing where output is no terminal."""

    def __init__(self, stream: TextIO | None = None) -> None:
        self._stream = sys.stderr if stream is None else stream
        self._width = 0

    def __call__(self, stage: str, done: float) -> None:
        """Rewrite the line."""
        if not self._stream.isatty():
            return
        text = f"{stage} {done:4.0%}"
        self._stream.write("\r" + text.ljust(self._width))
        self._stream.flush()
        self._width = len(text)

    def clear(self) -> None:
        """Wipe the line."""
        if self._width:
            self._stream.write("\r" + " " * self._width + "\r")
            self._stream.flush()
            self._width = 0
