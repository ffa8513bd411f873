"""What a newcomer can do after the demo: the very commands."""

import shlex
import shutil
import sys
from collections.abc import Iterator
from pathlib import Path

from service.demo.place import stream_id
from service.demo.story import FALLING_SHOW, HIT_SHOW

NAME = "knickpoint"


def about_the_demo(program: str, settings: Path) -> Iterator[tuple[str, str]]:
    """Questions about the demo's database, with the command that answers each."""
    end = f"--settings {shlex.quote(str(settings))}"
    hit, fallen = (shlex.quote(stream_id(show.name)) for show in (HIT_SHOW, FALLING_SHOW))
    yield "how every show stands", f"{program} streams {end}"
    yield "the fall, day by day", f"{program} history {fallen} --limit 12 {end}"
    yield "the runaway hit", f"{program} history {hit} --limit 16 {end}"
    yield "all shifts, those found in history too", f"{program} shifts {end}"
    yield "what was sent", f"{program} deliveries {end}"


def about_your_own(program: str) -> Iterator[tuple[str, str]]:
    """How to point it at one's own counts."""
    yield "a CSV file with the columns at and count", f"{program} replay FILE.csv"
    yield "a starter settings file, with a comment on every line", f"{program} init"
    yield "what is wrong with it, once it is edited", f"{program} check"
    yield "then watch your own sources", f"{program} run"


def program_name() -> str:
    """How the program was started, as it can be typed again from here."""
    started = Path(sys.argv[0])
    if started.name != NAME or not started.exists():
        return NAME
    found = shutil.which(NAME)
    if found is not None and Path(found).resolve() == started.resolve():
        return NAME
    try:
        return shlex.quote(str(started.absolute().relative_to(Path.cwd())))
    except ValueError:
        return shlex.quote(str(started.absolute()))
