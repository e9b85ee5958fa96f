"""The commands. Each only reads its options; the work is done in the other `fem.cli_` modules.

What a command needs is imported inside it, so that help comes at once.
"""

import signal
import sys
import traceback
from pathlib import Path
from typing import Annotated

import typer

from fem.cli.answer import BUG, INTERRUPTED, answering, ending
from fem.cli.stock import app as stock_app

app = typer.Typer(
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"]},
)
app.add_typer(stock_app, name="stock")

DocketFile = Annotated[Path, typer.Argument(metavar="DOCKET", help="NAME.docket.toml, or its .zip with the logs.")]
VariantName = Annotated[str | None, typer.Option("--variant", metavar="NAME", help="Take this variant of the docket.")]
AsJson = Annotated[bool, typer.Option("--json", help="Print JSON on the output; progress goes to the error stream.")]
Again = Annotated[bool, typer.Option("--again", help="Run even if the shelf holds this docket's record.")]
Band = Annotated[
    str | None,
    typer.Option(metavar="DT", help='Band wanted at the gauges that state none of their own: 0.5, or "0.5 K".'),
]
Cells = Annotated[int | None, typer.Option(metavar="N", help="Allowance: most cells of the finest mesh.")]
Seconds = Annotated[float | None, typer.Option(metavar="S", help="Allowance: longest wall time, s.")]


@app.callback(
    invoke_without_command=True,
    epilog=ending(
        "check deck.docket.toml",
        "look deck.docket.toml",
        "vouch deck.docket.toml",
        "export deck.docket.toml --what histories,fields --to results",
        "stock list brick",
    ),
)
def heatvouch(ctx: typer.Context) -> None:
    """Temperature histories of 2D sections, each number with the band that says how far it can be trusted."""
    if ctx.invoked_subcommand is None:
        typer.echo(ctx.get_help())


@app.command(
    epilog=ending("check deck.docket.toml", 'check deck.docket.toml --variant "thicker brick"'),
    short_help="Tell what a docket says and all that is wrong with it.",
)
def check(docket: DocketFile, *, variant: VariantName = None, as_json: AsJson = False) -> None:
    """Read a docket, build its section, and tell what was found; nothing is solved.

    All problems of the docket are told at once: file, place, value, what is allowed, how to mend it.
    """
    with answering(as_json=as_json):
        from fem.cli.check import check_docket

        check_docket(docket, variant=variant, as_json=as_json)


@app.command(
    epilog=ending("look deck.docket.toml", "look deck.docket.toml --json > look.json"),
    short_help="A picture in seconds, no band, no claim.",
)
def look(
    docket: DocketFile,
    *,
    variant: VariantName = None,
    as_json: AsJson = False,
    again: Again = False,
    cells: Cells = None,
    seconds: Seconds = None,
) -> None:
    """Take a quick look: one run on one mesh. It has no band and claims nothing."""
    with answering(as_json=as_json):
        from fem.cli.run import QUICK, asked_for, run

        asked = asked_for(docket, variant=variant, cells=cells, seconds=seconds, again=again, as_json=as_json)
        raise typer.Exit(run(asked, QUICK))


@app.command(
    epilog=ending(
        "vouch deck.docket.toml",
        'vouch deck.docket.toml --band "0.5 K" --seconds 300',
        'vouch deck.docket.toml --variant "thicker brick" --json > brick.json',
    ),
    short_help="Numbers with bands, verdicts on limits, a standing.",
)
def vouch(
    docket: DocketFile,
    *,
    variant: VariantName = None,
    as_json: AsJson = False,
    again: Again = False,
    band: Band = None,
    cells: Cells = None,
    seconds: Seconds = None,
) -> None:
    """Earn the docket's numbers: a band on each, a verdict on each limit, a standing.

    It goes on until the bands settle what was asked or the allowance is spent, and tells at each turn what it
    found. The record is kept beside the docket in NAME.records; a docket that has not changed is not run again.
    Ctrl-C keeps what was earned so far; a second one aborts at once.
    """
    with answering(as_json=as_json):
        from fem.cli.run import VOUCH, asked_for, run

        asked = asked_for(
            docket, variant=variant, band=band, cells=cells, seconds=seconds, again=again, as_json=as_json
        )
        raise typer.Exit(run(asked, VOUCH))


@app.command(
    epilog=ending(
        "export deck.docket.toml --to results",
        "export deck.docket.toml --what fields,mesh --to results",
        "export deck.docket.toml --what docket --to parcel",
    ),
    short_help="Write a record as CSV, VTU, MSH or JSON; pack a docket.",
)
def export(
    docket: DocketFile,
    *,
    what: Annotated[
        str, typer.Option(metavar="PARTS", help="Of histories, fields, mesh, figures, docket; with commas between.")
    ] = "histories,figures",
    to: Annotated[Path, typer.Option(metavar="FOLDER", help="Where to; made if need be.")] = Path(),
    variant: VariantName = None,
    record: Annotated[
        Path | None, typer.Option(metavar="FOLDER", help="Take this record, not the one that answers the docket.")
    ] = None,
    as_json: AsJson = False,
) -> None:
    """Write a record in open formats: CSV, VTU with PVD, MSH, JSON; or the docket packed with its logs.

    The record is the vouch on the docket's shelf, or its quick look where there is no vouch. One of a run with
    --band, --cells or --seconds is named with --record.
    """
    with answering(as_json=as_json):
        from fem.cli.export import export_docket

        export_docket(docket, what, to, variant=variant, record=record, as_json=as_json)


def main() -> None:
    """Run the command line; a fault of ours keeps its trace and has an exit code of its own.

    Where the reader of the output has left (``| head``), the program ends quietly by the system's own signal.
    """
    if hasattr(signal, "SIGPIPE"):  # not on every system
        signal.signal(signal.SIGPIPE, signal.SIG_DFL)
    try:
        app()
    except SystemExit as ended:
        # Typer's own code for a Ctrl-C that comes before any command has begun.
        sys.exit(INTERRUPTED if ended.code == 128 + signal.SIGINT else ended.code)
    except Exception:  # noqa: BLE001 - told apart from every standing, with all that is needed to find it
        traceback.print_exc()
        sys.exit(BUG)


if __name__ == "__main__":
    main()
