"""`knickpoint send-again`: deliveries that were given up are tried anew."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("send-again", short_help="Queue deliveries again that were given up.")
@click.argument("deliveries", nargs=-1, required=True, metavar="DELIVERY...")
@json_option
@settings_option
@click.pass_obj
def command(given: Given, deliveries: tuple[str, ...], as_json: bool) -> None:
    """Put each DELIVERY (an id, see `knickpoint deliveries`) back into the queue, due now.

    It goes out with its old id and body when the daemon or `knickpoint poll` next delivers; a receiver that
    has had it knows it by the id.
    """
    from service.cli.opening import now, writing
    from service.cli.show import say, show_json
    from storage.outbox import send_again

    with writing(given) as conn:
        for delivery in deliveries:
            send_again(conn, delivery, now=now())
    if as_json:
        show_json({"waiting": deliveries})
    else:
        say(f"Waiting to be sent again: {', '.join(deliveries)}")
