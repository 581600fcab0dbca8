"""How far a study is: an interface, its do-nothing twin, and a bar with the time left for people at a terminal."""

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Protocol

from rich.console import Console
from rich.progress import (
    BarColumn,
    MofNCompleteColumn,
    TextColumn,
    TimeRemainingColumn,
)
from rich.progress import Progress as RichProgress

_PATIENCE = 2.0  # seconds that people wait without asking how long it takes


class Progress(Protocol):
    """What a study tells of its way. One object may see several studies, one after the other."""

    def begin(self, total: int, finished: int) -> None:
        """A study of `total` chunks starts, `finished` of them found done."""

    def advance(self) -> None:
        """One more chunk is done."""

    def end(self) -> None:
        """The study is over, or was broken off."""


class NoProgress:
    """Tells nobody."""

    def begin(self, total: int, finished: int) -> None:
        """Do nothing."""

    def advance(self) -> None:
        """Do nothing."""

    def end(self) -> None:
        """Do nothing."""


class BarProgress:
    """A bar on a console, with the chunks done and the time left, shown once a study has taken `patience` seconds."""

    def __init__(self, console: Console, patience: float = _PATIENCE) -> None:
        self._console = console
        self._patience = patience
        self._bar: RichProgress | None = None
        self._timer: threading.Timer | None = None

    def begin(self, total: int, finished: int) -> None:
        """Set up the bar; it stays hidden at first."""
        self._bar = RichProgress(
            TextColumn("{task.description}"),
            BarColumn(),
            MofNCompleteColumn(),
            TimeRemainingColumn(),
            console=self._console,
            transient=True,  # nothing of it is left between the results
        )
        self._bar.add_task("working", total=total, completed=finished)
        # A timer rather than a look at each chunk: the first chunk alone may take a minute.
        self._timer = threading.Timer(self._patience, self._bar.start)
        self._timer.daemon = True
        self._timer.start()

    def advance(self) -> None:
        """Move the bar by one chunk."""
        if self._bar is not None:
            self._bar.advance(self._bar.task_ids[0])

    def end(self) -> None:
        """Take the bar away."""
        if self._timer is not None and self._bar is not None:
            self._timer.cancel()
            self._timer.join()  # it may be just starting the bar, which must then be stopped
            self._bar.stop()
        self._bar = self._timer = None


@contextmanager
def console_progress() -> Iterator[Progress]:
    """Give a bar on standard error if that is a terminal, else one that tells nobody."""
    console = Console(stderr=True)
    progress: Progress = BarProgress(console) if console.is_terminal else NoProgress()
    try:
        yield progress
    finally:
        progress.end()
