"""The command `knickpoint`."""

import os
import sys
from importlib import import_module
from pathlib import Path

import click

from service.cli.installation import require_own_packages, version
from service.cli.options import SETTINGS_VARIABLE, Given
from service.exit_codes import MEANINGS, Exit, code_for, explains_itself

# In the order in which a newcomer meets them; each stands in service/cli/commands under its name.
COMMANDS = (
    "demo",
    "replay",
    "init",
    "check",
    "try-source",
    "try-outlet",
    "run",
    "poll",
    "streams",
    "history",
    "shifts",
    "rounds",
    "deliveries",
    "send-again",
    "hush",
    "rebuild",
    "migrate",
)

EXIT_CODES = "\b\nExit codes:\n" + "\n".join(f"{code.value:>5}  {text}" for code, text in MEANINGS.items())


class LazyGroup(click.Group):
    """Imports the file of a command when the command is asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = import_module(f"service.cli.commands.{cmd_name.replace('-', '_')}").command
        return command


@click.group(cls=LazyGroup, epilog=EXIT_CODES, context_settings={"help_option_names": ["-h", "--help"]})
@click.option(
    "--settings",
    type=click.Path(path_type=Path),
    default=Path("knickpoint.toml"),
    show_default=True,
    envvar=SETTINGS_VARIABLE,
    show_envvar=True,
    metavar="FILE",
    help="The settings file.",
)
@click.version_option(version(), prog_name="knickpoint", message="%(prog)s %(version)s")
@click.pass_context
def knickpoint(ctx: click.Context, settings: Path) -> None:
    """Tells the people who look after serial releases when the level of a show has really moved."""
    ctx.obj = Given(settings)


def main() -> None:
    """Run the command line and leave with its exit code."""
    sys.exit(run_command(sys.argv[1:]))


def run_command(arguments: list[str]) -> int:
    """Run one command line; errors become one sentence on standard error and an exit code."""
    try:
        require_own_packages()
        # What a command hands to ctx.exit comes back from here; other commands return nothing.
        return knickpoint.main(arguments, prog_name="knickpoint", standalone_mode=False) or Exit.GOOD
    except click.ClickException as error:
        error.show()
        return Exit.WRONG_USE
    except (click.Abort, KeyboardInterrupt):
        return Exit.INTERRUPTED
    except BrokenPipeError:
        return _reader_went_away()
    except Exception as error:
        if not explains_itself(error):
            raise
        click.echo(f"knickpoint: {error}", err=True)
        return code_for(error)


def _reader_went_away() -> int:
    # As in `knickpoint shifts | head`. Python flushes once more at its end, which would complain again.
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return Exit.TROUBLE


if __name__ == "__main__":
    main()
