"""`knickpoint shifts`: what was announced."""

import click

from service.cli.options import Given, json_option, limit_option, settings_option


@click.command("shifts", short_help="Shifts of level, the newest first.")
@click.option("--stream", help="Only those of this stream.")
@click.option(
    "--origin",
    type=click.Choice(["live", "history"]),
    help="live: noticed while watching, and told; history: found in older counts, and never told.",
)
@limit_option(100)
@json_option
@settings_option
@click.pass_obj
def command(given: Given, stream: str | None, origin: str | None, limit: int, as_json: bool) -> None:
    """Shifts of level, the newest first. Levels are filtered figures, as they stood when it was noticed."""
    from service.cli.opening import reading, require_stream
    from service.cli.shift_view import shift_json, show_shifts
    from service.cli.show import show_json
    from storage.shifts import list_shifts
    from storage.streams import list_streams

    with reading(given) as conn:
        wanted = None if stream is None else require_stream(conn, stream).id
        shifts = list_shifts(conn, stream_id=wanted, origin=origin, limit=limit)
        streams = {each.id: each for each in list_streams(conn)}
    if as_json:
        show_json([shift_json(shift, streams) for shift in shifts])
    else:
        show_shifts(shifts, streams)
