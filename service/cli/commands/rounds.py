"""`knickpoint rounds`: what each pass for a source brought."""

import click

from service.cli.options import Given, json_option, limit_option, settings_option


@click.command("rounds", short_help="What each round brought, kept out or failed at.")
@click.argument("number", type=int, required=False, metavar="[ROUND]")
@click.option("--source", help="Only those of this source.")
@limit_option(30)
@json_option
@settings_option
@click.pass_obj
def command(given: Given, number: int | None, source: str | None, limit: int, as_json: bool) -> None:
    """Rounds, the newest first; or one ROUND by its number, with the rows that it kept out and why."""
    from service.cli.opening import reading
    from service.cli.rounds_view import show_round, show_rounds
    from service.cli.show import show_json
    from service.cli.work_view import round_json
    from storage.rounds import get_round, list_rounds

    with reading(given) as conn:
        one = None if number is None else get_round(conn, number)
        rounds = () if one else list_rounds(conn, source=source, limit=limit)
    if as_json:
        show_json(round_json(one) if one else [round_json(each) for each in rounds])
    elif one:
        show_round(one)
    else:
        show_rounds(rounds)
