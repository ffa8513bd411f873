"""`knickpoint deliveries`: what was sent where, and what could not be."""

import click

from service.cli.options import Given, json_option, limit_option, settings_option

STATES = {"waiting": "waiting", "delivered": "delivered", "given-up": "given_up"}


@click.command("deliveries", short_help="What was sent where, and what could not be.")
@click.argument("delivery", required=False)
@click.option("--state", type=click.Choice(list(STATES)), help="Only those that stand so.")
@click.option("--outlet", help="Only those to this outlet.")
@limit_option(50)
@json_option
@settings_option
@click.pass_obj
def command(
    given: Given, delivery: str | None, state: str | None, outlet: str | None, limit: int, as_json: bool
) -> None:
    """Deliveries, the newest first; or one DELIVERY by its id, with each attempt.

    One that was given up can be sent again: knickpoint send-again DELIVERY.
    """
    from service.cli.deliveries_view import show_deliveries, show_delivery
    from service.cli.opening import reading
    from service.cli.show import show_json
    from service.cli.work_view import delivery_json
    from storage.outbox import Delivery, get_delivery, list_attempts, list_deliveries

    with reading(given) as conn:
        if delivery is not None:
            found: tuple[Delivery, ...] = (get_delivery(conn, delivery),)
        else:
            found = list_deliveries(conn, state=STATES[state] if state else None, outlet=outlet, limit=limit)
        attempts = {one.id: list_attempts(conn, one.id) for one in found} if delivery or as_json else {}
    if as_json:
        lines = [delivery_json(one, attempts[one.id]) for one in found]
        show_json(lines[0] if delivery else lines)
    elif delivery is not None:
        show_delivery(found[0], attempts[delivery])
    else:
        show_deliveries(found)
