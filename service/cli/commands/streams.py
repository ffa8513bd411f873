"""`knickpoint streams`: every stream, how it stands and what was last said of it."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("streams", short_help="Every stream, and how it stands.")
@click.option("--source", help="Only those of this source.")
@click.option("--slate", help="Only those of this slate.")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, source: str | None, slate: str | None, as_json: bool) -> None:
    """Every stream: how it stands, its newest count and what was said after it.

    \b
    late        its source has not been reached for more than two rounds
    too short   too few counts to say anything
    unsettled   a shift was announced within the window
    steady      nothing of all that
    """
    from service.cli.opening import now, reading, settings_of
    from service.cli.show import show_json
    from service.cli.standings import standings_of
    from service.cli.stream_view import show_streams, stream_json
    from storage.streams import list_streams

    with reading(given) as conn:
        streams = list_streams(conn, source=source, slate=slate)
        standings = standings_of(conn, settings_of(given), streams, now())
    if as_json:
        show_json([stream_json(one) for one in standings])
    else:
        show_streams(standings)
