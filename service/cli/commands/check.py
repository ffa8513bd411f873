"""`knickpoint check`: whether the settings can be used."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("check", short_help="Say all that is wrong with the settings.")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, as_json: bool) -> None:
    """Read the settings file and say all that is wrong with it at once. Reaches no source or outlet."""
    raise NotImplementedError
