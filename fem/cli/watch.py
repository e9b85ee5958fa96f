"""What a user sees and may do while the work runs: a bar with time left, each turn as it comes, Ctrl-C."""

import os
import signal
import threading
import time
from types import FrameType, TracebackType
from typing import TYPE_CHECKING, Any, Self

from rich.console import Console
from rich.progress import BarColumn, Progress, TaskID, TaskProgressColumn, TextColumn
from rich.text import Text

from fem.results.record import TurnNote

if TYPE_CHECKING:
    from fem.runs.study import Progress as Work

PLAIN_EVERY = 10.0
"""Seconds between two lines about the same piece of work where there is no terminal to draw a bar on."""
STOPPING = b"\nstopping after this step; what was earned is kept. Ctrl-C again aborts at once and keeps nothing.\n"


class Watch:
    """Shows progress on a console and turns the first Ctrl-C into a request to stop; the second aborts.

    Parameters
    ----------
    console : Console
        On the error stream, so that the output stays for results.
    """

    def __init__(self, console: Console) -> None:
        self.console = console
        self.turns = 0
        self._stop = threading.Event()
        self._before: Any = None
        self._bar: Progress | None = None
        self._task: TaskID | None = None
        self._told, self._told_at = "", -PLAIN_EVERY

    # --- as a context -----------------------------------------------------------------------------
    def __enter__(self) -> Self:
        """Take over Ctrl-C and, on a terminal, show the bar."""
        if threading.current_thread() is threading.main_thread():
            self._before = signal.signal(signal.SIGINT, self._interrupt)
        if self.console.is_terminal:
            columns = (TextColumn("{task.description}", markup=False), BarColumn(bar_width=30), TaskProgressColumn())
            self._bar = Progress(*columns, TextColumn("{task.fields[left]}"), console=self.console, transient=True)
            self._task = self._bar.add_task("section and mesh", total=1.0, left="")
            self._bar.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Give Ctrl-C back and clear the bar."""
        if self._bar is not None:
            self._bar.stop()
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)

    def _interrupt(self, _number: int, _frame: FrameType | None) -> None:
        self._stop.set()
        signal.signal(signal.SIGINT, signal.default_int_handler)
        os.write(2, STOPPING)  # plain: a handler may run in the middle of a print

    # --- what the work calls ----------------------------------------------------------------------
    def stop(self) -> bool:
        """Return whether the user asked to stop."""
        return self._stop.is_set()

    def on_progress(self, work: "Work") -> None:
        """Show how far the work is."""
        if self._bar is not None and self._task is not None:
            left = time_left(work.seconds_left)
            self._bar.update(self._task, description=work.doing, completed=work.fraction, left=left)
            return
        now = time.monotonic()
        if work.doing != self._told or now - self._told_at >= PLAIN_EVERY:
            self._told, self._told_at = work.doing, now
            left = time_left(work.seconds_left)
            self._say(f"{work.doing}: {100.0 * work.fraction:.0f} %" + (f", {left}" if left else ""))

    def on_turn(self, note: TurnNote) -> None:
        """Tell what a turn found and what comes next."""
        self.turns += 1
        self._say(f"turn {self.turns}, after {note.seconds:.1f} s, on up to {note.cells} cells and {note.steps} steps")
        self._say(f"  found: {note.found}")
        self._say(f"  next:  {note.then}")

    def _say(self, text: str) -> None:
        self.console.print(Text(text), soft_wrap=True)


def time_left(seconds: float | None) -> str:
    """Return the time left as a person says it; empty when nobody can know yet.

    Examples
    --------
    >>> time_left(None), time_left(4.2), time_left(130.0)
    ('', '5 s left', '2 min 10 s left')
    """
    if seconds is None:
        return ""
    whole = int(seconds) + 1 if seconds != int(seconds) else int(seconds)
    return f"{whole} s left" if whole < 60 else f"{whole // 60} min {whole % 60} s left"
