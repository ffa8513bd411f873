"""`knickpoint run`: the daemon."""

import click

from service.cli.options import Given, settings_option


@click.command("run", short_help="Watch the sources until told to stop.")
@settings_option
@click.pass_obj
def command(given: Given) -> None:
    """Watch the sources until told to stop (SIGTERM, or Ctrl-C). Makes or migrates the database first."""
    from service.daemon import run

    run(given.settings)
