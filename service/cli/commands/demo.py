"""`knickpoint demo`: an invented house, watched at high speed."""

from pathlib import Path

import click


@click.command("demo", short_help="Watch an invented house at high speed.")
@click.option(
    "--folder",
    type=click.Path(path_type=Path, file_okay=False),
    help="Where its settings file and database are written; without it, a new temporary folder.",
)
@click.option(
    "--seconds",
    type=click.FloatRange(5, 3600),
    default=60.0,
    show_default=True,
    help="Ends after so long at the latest.",
)
@click.pass_context
def command(ctx: click.Context, folder: Path | None, seconds: float) -> None:
    """Watch an invented house with invented counts, on this machine alone and at high speed.

    Needs no network and no settings. Shows counts being polled, a runaway hit that does not ring, a fall that
    does, and the alert as delivered; afterwards `history` and `shifts` can be asked about it.
    """
    from service.demo.main import run_demo

    ctx.exit(run_demo(folder, seconds))
