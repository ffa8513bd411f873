"""`knickpoint try-source`: a source fetched once, shown as understood, and not stored."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("try-source", short_help="Fetch a source once; show it, store nothing.")
@click.argument("name")
@click.option("--limit", type=click.IntRange(1), default=40, show_default=True, help="Show so many rows.")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, name: str, limit: int, as_json: bool) -> None:
    """Fetch the source NAME once and show its rows as understood, and those kept out. Stores nothing."""
    from time import monotonic

    from service.cli.named import source_named
    from service.cli.opening import now
    from service.cli.show import show_json
    from service.cli.source_view import show_tried, tried_json
    from service.cli.trying import try_source

    tried = try_source(source_named(given, name), monotonic, now())
    if as_json:
        show_json(tried_json(tried))
    else:
        show_tried(tried, limit)
