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
@click.option(
    "--superseded", is_flag=True, help="Also what was said before and has been replaced by a re-fold."
)
@click.option(
    "--place",
    type=click.IntRange(0),
    help="Only the count at this place (0 is the first), with all that was ever said of it.",
)
@json_option
@settings_option
@click.pass_obj
def command(
    given: Given,
    stream: str,
    since: At | None,
    until: At | None,
    limit: int,
    superseded: bool,
    place: int | None,
    as_json: bool,
) -> None:
    """What was said after each count of STREAM (its id, see `knickpoint streams`), the newest last.

    With --json each count comes with its whole run-length posterior, and those of dispersion and wander.
    """
    from service.cli.history_rows import Span, all_rows, current_rows, labels_for
    from service.cli.history_view import history_json, show_evidence, show_history
    from service.cli.moments import aware
    from service.cli.opening import reading, require_stream, zone_of
    from service.cli.show import show_json
    from storage.posteriors import evidence

    zone = zone_of(given)
    first, end = (None if each is None else aware(each, zone) for each in (since, until))
    span = Span(first, end, limit)
    with reading(given) as conn:
        found = require_stream(conn, stream)
        if place is not None:
            rows = evidence(conn, found.id, place)
        else:
            rows = all_rows(conn, found, span) if superseded else current_rows(conn, found, span)
        labels = labels_for(conn, found, rows)
    if as_json:
        show_json({"stream": found.id, "title": found.title, "history": [history_json(one) for one in rows]})
    elif superseded or place is not None:
        show_evidence(found, rows, labels)
    else:
        show_history(found, rows, labels)
