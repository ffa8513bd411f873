"""`knickpoint try-outlet`: a trial message to an outlet."""

import click

from service.cli.options import Given, json_option, settings_option


@click.command("try-outlet", short_help="Send an outlet a message that says it is a trial.")
@click.argument("name")
@json_option
@settings_option
@click.pass_context
def command(ctx: click.Context, name: str, as_json: bool) -> None:
    """Send the outlet NAME one message that says it is a trial, and show the answer. Stores nothing."""
    from service.cli.named import outlet_named
    from service.cli.opening import now
    from service.cli.show import say, show_json
    from service.exit_codes import Exit
    from service.outlets.trial import try_outlet

    given: Given = ctx.obj
    tried = try_outlet(outlet_named(given, name), now())
    if as_json:
        show_json(tried)
    else:
        say(tried.sentence)
    if not tried.taken:
        ctx.exit(Exit.NOT_DELIVERED)
