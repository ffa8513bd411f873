"""`knickpoint history`: the stored run-length history of a stream."""

import datetime

import click

from service.cli.options import Given, MomentType, json_option, limit_option, settings_option

At = datetime.date | datetime.datetime


@click.command("history", short_help="The stored run-length history of a stream.")
@click.argument("stream")
@click.option("--since", type=MomentType(), help="From this day or instant on.")
@click.option("--until", type=MomentType(), help="Before this day or instant.")
@limit_option(60)
@json_option
@settings_option
@click.pass_obj
def command(given: Given, stream: str, since: At | None, until: At | None, limit: int, as_json: bool) -> None:
    """What was said after each count of STREAM (its id, see `knickpoint streams`), the newest last.

    With --json each count comes with its whole run-length posterior, and those of dispersion and wander.
    """
    from service.cli.history_view import show_history
    from service.cli.moments import aware
    from service.cli.opening import reading, require_stream, zone_of
    from service.cli.show import show_json
    from service.cli.stream_view import history_json
    from storage.posteriors import history

    zone = zone_of(given)
    first, end = (None if each is None else aware(each, zone) for each in (since, until))
    with reading(given) as conn:
        found = require_stream(conn, stream)
        stored = history(conn, found.id, since=first, until=end, limit=limit)
    if as_json:
        show_json(
            {"stream": found.id, "title": found.title, "history": [history_json(one) for one in stored]}
        )
    else:
        show_history(found, stored)
