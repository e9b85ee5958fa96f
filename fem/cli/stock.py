"""`heatvouch stock`: the library of materials, with where each value comes from."""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from fem.cli.answer import answering, ending, out, put_json, say, tell

if TYPE_CHECKING:
    from fem.stock import Stock

app = typer.Typer(rich_markup_mode=None)

MOST = 3
"""Stocks that an error suggests."""

AsJson = Annotated[bool, typer.Option("--json", help="Print JSON on the output.")]
Name = Annotated[str, typer.Argument(metavar="NAME", help="The stock's name, in quotes if it has blanks.")]


@app.callback(
    invoke_without_command=True,
    epilog=ending(
        "stock list insulating brick", 'stock show "fireclay brick"', 'stock plot "fireclay brick" --to fireclay.png'
    ),
)
def stock(ctx: typer.Context) -> None:
    """List, show and plot the library's materials."""
    if ctx.invoked_subcommand is None:
        typer.echo(ctx.get_help())


@app.command("list", epilog=ending("stock list", "stock list insulating brick"))
def list_stock(
    search: Annotated[str, typer.Argument(metavar="[SEARCH]", help="Words that its name or family must hold.")] = "",
    *,
    as_json: AsJson = False,
) -> None:
    """List the stocks of the library."""
    with answering(as_json=as_json):
        from fem.cli.stock_tables import listing, listing_table
        from fem.stock import find, library

        found = find(search) if search.strip() else list(library().values())
        if as_json:
            put_json({"stock": [listing(stock) for stock in found]})
        elif found:
            out().print(listing_table(found))
        else:
            say(f'no stock of the library holds "{search}"; without a search word all are listed')


@app.command("show", epilog=ending('stock show "fireclay brick"'))
def show_stock(name: Name, *, as_json: AsJson = False) -> None:
    """Show a stock: its values over temperature, where they hold, and where each comes from."""
    with answering(as_json=as_json):
        from fem.cli.stock_tables import listing, show

        stock = named(name)
        if as_json:
            put_json(listing(stock))
        else:
            show(out(), stock)


@app.command("plot", epilog=ending('stock plot "fireclay brick" --to fireclay.png'))
def plot(
    name: Name,
    *,
    to: Annotated[Path, typer.Option(metavar="FILE.png", help="The picture; one that is there is replaced.")],
) -> None:
    """Plot a stock's properties over temperature, with their sources, into a PNG file."""
    with answering(as_json=False):
        from fem.errors import DocketError, StoreError
        from fem.stock.plot import plot_stock

        if to.suffix.lower() != ".png":
            raise DocketError.single(
                "--to", str(to), "a file that ends in .png", "name it so: it will hold a PNG picture"
            )
        try:
            tell(f"wrote {plot_stock(named(name), to)}")
        except OSError as error:
            raise StoreError(f"{to} could not be written: {error.strerror or error}") from error


def named(name: str) -> "Stock":
    """Return the library's stock of that name or alias.

    Raises
    ------
    DocketError
        If there is none, with the names that hold its words, or else with the nearest.
    """
    from fem.errors import DocketError
    from fem.stock import library, nearest

    for stock in library().values():
        if name.casefold() in (label.casefold() for label in (stock.name, *stock.aliases)):
            return stock
    close = ", ".join(f'"{label}"' for label in nearest(name, MOST))
    hint = f"did you mean {close}?" if close else "`heatvouch stock list` shows all names"
    raise DocketError.single("stock", f'"{name}"', "a name of the library", hint)
