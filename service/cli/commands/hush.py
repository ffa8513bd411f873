"""`knickpoint hush`: a stream whose alerts are recorded but not sent until a date."""

import datetime

import click

from service.cli.options import Given, MomentType, json_option, settings_option


@click.command("hush", short_help="Send no alerts of a stream until a date.")
@click.argument("stream")
@click.option(
    "--until",
    type=MomentType(),
    help="A day, from whose beginning alerts are sent again, or an instant.",
)
@click.option("--lift", is_flag=True, help="Send alerts again from now on.")
@json_option
@settings_option
@click.pass_obj
def command(
    given: Given, stream: str, until: datetime.date | datetime.datetime | None, lift: bool, as_json: bool
) -> None:
    """Record the alerts of STREAM but send none until a date."""
    from service.cli.hushing import end_of_hush
    from service.cli.opening import now, require_stream, writing, zone_of
    from service.cli.show import say, show_json
    from storage.streams import hush_stream

    ends = end_of_hush(until, lift, now(), zone_of(given))
    with writing(given) as conn:
        found = require_stream(conn, stream)
        hush_stream(conn, found.id, ends)
    if as_json:
        show_json({"stream": found.id, "hushed_until": ends})
    elif ends is None:
        say(f"{found.title}: alerts are sent.")
    else:
        say(f"{found.title}: alerts are recorded but not sent until {ends.isoformat(timespec='minutes')}.")
