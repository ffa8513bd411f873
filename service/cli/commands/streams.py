"""`knickpoint streams`: every stream and what was last said of it."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("streams", short_help="Every stream and what was last said of it.")
@click.option("--source", help="Only those of this source.")
@click.option("--slate", help="Only those of this slate.")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, source: str | None, slate: str | None, as_json: bool) -> None:
    """Every stream, with its newest count and what was said after it."""
    from service.cli.opening import reading
    from service.cli.show import show_json, show_table
    from service.cli.stream_view import STREAM_COLUMNS, stream_cells, stream_json
    from storage.posteriors import newest_posteriors
    from storage.streams import list_streams

    with reading(given) as conn:
        streams, newest = list_streams(conn, source=source, slate=slate), newest_posteriors(conn)
    if as_json:
        show_json([stream_json(stream, newest.get(stream.id)) for stream in streams])
    else:
        show_table(STREAM_COLUMNS, [stream_cells(stream, newest.get(stream.id)) for stream in streams])
