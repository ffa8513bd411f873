"""`knickpoint rebuild`: streams folded again from their readings."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("rebuild", short_help="Fold streams again from their readings.")
@click.argument("streams", nargs=-1, metavar="[STREAM]...")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, streams: tuple[str, ...], as_json: bool) -> None:
    """Fold each STREAM, or all, again from its stored readings. Tells nobody.

    What was said before is kept as evidence; shifts that are new by it are recorded as found in history.
    """
    from service.cli.rebuilding import REBUILT_COLUMNS, rebuild_with_progress, rebuilt_cells
    from service.cli.show import show_json, show_table
    from service.logs import configure

    configure("words", "warning")
    rebuilt = rebuild_with_progress(given, streams)
    if as_json:
        show_json(rebuilt)
    else:
        show_table(REBUILT_COLUMNS, [rebuilt_cells(one) for one in rebuilt])
