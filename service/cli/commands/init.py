"""`knickpoint init`: a commented starter file."""

from pathlib import Path

import click

from service.cli.options import Given, settings_option


@click.command("init", short_help="Write a commented starter file.")
@click.argument("file", type=click.Path(path_type=Path, dir_okay=False), required=False)
@settings_option
@click.pass_obj
def command(given: Given, file: Path | None) -> None:
    """Write a commented starter file to FILE, or where --settings points. Never overwrites."""
    from config.starter import starter_text
    from service.cli.show import say
    from service.cli.writing import write_new

    place = file or given.settings
    write_new(place, starter_text())
    option = "" if place == Path("knickpoint.toml") else f" --settings {place}"
    say(f"Wrote {place}. Edit it, then: knickpoint{option} check")
