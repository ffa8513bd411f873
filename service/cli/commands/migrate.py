"""`knickpoint migrate`: the database is brought to this program's tables."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("migrate", short_help="Bring the database to this program's tables.")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, as_json: bool) -> None:
    """Bring the database to the tables of this program, in one transaction; make it if it is not there.

    On a database that has them already, nothing is done. Copy the file first: an older program does not
    read newer tables.
    """
    from service.cli.opening import database_of
    from service.cli.show import say, show_json
    from storage.engine import open_store
    from storage.migrate import upgrade

    with open_store(database_of(given)) as store:
        upgraded = upgrade(store)
        place = store.place
    if as_json:
        show_json({"database": place, "before": upgraded.before, "after": upgraded.after})
    elif upgraded.before == upgraded.after:
        say(f"{place} has the tables of version {upgraded.after} already.")
    else:
        before = upgraded.before or "none"
        say(f"{place}: from version {before} to {upgraded.after}.")
