"""How a command ends: exit codes, the two consoles, and errors told without a traceback."""

import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import typer

if TYPE_CHECKING:
    from rich.console import Console

    from fem.errors import Problem

DONE = VOUCHED = 0
OPEN = 1
BAD_INPUT = 2
INTERRUPTED = 3
BUG = 70
"""EX_SOFTWARE of BSD's sysexits.h: a fault of ours is never taken for a standing."""

EXIT_CODES = """\b
Exit codes
   0  vouched, also where a limit is vouched to be not met: read the verdict
      in the table or in --json; check, look, export, stock: done
   1  open (the reasons are told); look: the work did not finish
   2  bad input, or a file or folder that cannot be read or written
   3  interrupted by Ctrl-C
  70  a fault of this program, with its trace
 141  what the shell says where the reader of the output (head) left early"""


def ending(*examples: str) -> str:
    """Return what stands at the end of a command's help: its examples, one a line, and the exit codes."""
    return "\n".join(("\b", "Examples", *(f"  heatvouch {example}" for example in examples))) + f"\n\n{EXIT_CODES}"


AS_IT_IS: dict[str, Any] = {"markup": False, "emoji": False, "highlight": False}
"""Of every console: names and titles are the user's own, and nothing in them is an instruction to the screen."""
PIPE_WIDTH = 120
"""Characters a line where the output is no terminal and COLUMNS does not say."""


def out() -> "Console":
    """Return the console of results."""
    return _console(error=False)


def err() -> "Console":
    """Return the console of progress and messages."""
    return _console(error=True)


def _console(*, error: bool) -> "Console":
    from rich.console import Console

    terminal = (sys.stderr if error else sys.stdout).isatty()
    width = None if terminal or "COLUMNS" in os.environ else PIPE_WIDTH
    return Console(stderr=error, width=width, **AS_IT_IS)


def say(text: str) -> None:
    """Print one message on the error stream, as it is."""
    err().print(text, soft_wrap=True)


def tell(text: str) -> None:
    """Print one line on the output, as it is."""
    out().print(text, soft_wrap=True)


def put_json(content: dict[str, Any]) -> None:
    """Print plain data as strict JSON on the output."""
    from fem.results.plain_json import as_json

    sys.stdout.write(as_json(content) + "\n")


@contextmanager
def answering(*, as_json: bool) -> Iterator[None]:
    """Turn every error that is not our bug into a message and an exit code."""
    from fem.errors import DocketError, HeatvouchError

    try:
        yield
    except DocketError as error:
        if as_json:
            put_json({"problems": [vars(problem) for problem in error.problems]})
        _tell_problems(error.problems)
        raise typer.Exit(BAD_INPUT) from None
    except HeatvouchError as error:
        if as_json:
            put_json({"error": str(error)})
        say(str(error))
        raise typer.Exit(BAD_INPUT) from None
    except KeyboardInterrupt:
        say("aborted; nothing of this work was kept")
        raise typer.Exit(INTERRUPTED) from None


def _tell_problems(problems: "tuple[Problem, ...]") -> None:
    many = len(problems) != 1
    say(f"{len(problems)} problem{'s' if many else ''}; nothing was computed.")
    for number, problem in enumerate(problems, start=1):
        where = ": ".join(part for part in (problem.file, problem.place) if part)
        say(f"\n{number}. {where}")
        rows = (("found", problem.value), ("at", problem.at), ("allowed", problem.allowed), ("to mend", problem.hint))
        for name, text in rows:
            if text:
                say(f"   {name:8} {text}")
