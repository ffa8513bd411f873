"""`knickpoint poll`: one round now."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("poll", short_help="One round now, then end.")
@click.argument("sources", nargs=-1, metavar="[SOURCE]...")
@json_option
@settings_option
@click.pass_context
def command(ctx: click.Context, sources: tuple[str, ...], as_json: bool) -> None:
    """One round now for each SOURCE, or for all: read, keep, advance, record, tell, deliver; then end.

    May be used beside a running daemon. Leaves with 4 if a source could not be read, else with 1 if a stream
    could not be folded, else with 7 if a delivery that was due did not arrive.
    """
    from service.cli.rounds_view import show_polled
    from service.cli.show import show_json
    from service.cli.work_view import round_json
    from service.exit_codes import Exit
    from service.logs import configure
    from service.poll import poll_once
    from storage.rounds import FAILED

    given: Given = ctx.obj
    configure("words", "warning")
    polled = poll_once(given.settings, sources)
    if as_json:
        show_json([round_json(one) for one in polled.rounds])
    else:
        show_polled(polled.rounds)
    if any(one.outcome == FAILED for one in polled.rounds):
        ctx.exit(Exit.UNREADABLE)
    if polled.unfolded:
        ctx.exit(Exit.TROUBLE)
    if polled.deliveries.put_off or polled.deliveries.given_up:
        ctx.exit(Exit.NOT_DELIVERED)
