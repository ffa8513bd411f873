"""`knickpoint check`: whether the settings can be used."""

import click

from service.cli.options import Given, json_option, settings_option
from service.exit_codes import Exit


@click.command("check", short_help="Say all that is wrong with the settings.")
@json_option
@settings_option
@click.pass_context
def command(ctx: click.Context, as_json: bool) -> None:
    """Read the settings file and say all that is wrong with it at once. Reaches no source or outlet."""
    from service.cli.checking import check, show_checked

    given: Given = ctx.obj
    checked = check(given)
    show_checked(checked, as_json)
    if checked.faults:
        ctx.exit(Exit.SETTINGS)
