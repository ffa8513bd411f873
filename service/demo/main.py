"""The demo: the ordinary daemon with ordinary settings, on a clock that takes a second for a day."""

import datetime
import logging
import os
import time
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

from service.clock import FastClock
from service.demo import screen
from service.demo.counting import counting_service
from service.demo.next_steps import about_the_demo, about_your_own, program_name
from service.demo.place import EVERY_HOURS, LOG, make_folder, new_secret, write_settings
from service.demo.receiver import Arrivals, desk
from service.demo.story import FALLING_SHOW, HISTORY_DAYS, HIT_SHOW, HOUSE, SHOWS, Almanac
from service.demo.telling import Ending, Stage, tell_story
from service.exit_codes import Exit
from service.logs import configure
from service.wiring import Wired, wire
from storage.engine import open_store
from storage.migrate import upgrade

DAYS_A_SECOND = 1.0
PLANNED_DAYS = HISTORY_DAYS + 21
"""The story ends about there: so its end lies about today, and no date far ahead."""
FIRST_POLL = datetime.time(6)
# Of the time allowed, so much is kept for ending in good order.
ENDING_SECONDS = 2.0


def run_demo(folder: Path | None, seconds: float) -> int:
    """Tell the story on the screen; 0 if the alert arrived, 1 if not."""
    ends = time.monotonic() + seconds - ENDING_SECONDS
    folder = make_folder(folder)
    today = datetime.datetime.now(datetime.UTC).date()
    almanac = Almanac(today - datetime.timedelta(days=PLANNED_DAYS))
    begins = datetime.datetime.combine(almanac.date(HISTORY_DAYS), FIRST_POLL, datetime.UTC)
    clock = FastClock(begins, DAYS_A_SECOND * 86_400)
    secret, arrivals = new_secret(), Arrivals()
    with ExitStack() as stack:
        counting = stack.enter_context(counting_service(clock, almanac))
        receiving = stack.enter_context(desk(clock, secret, arrivals))
        settings = write_settings(folder, counting=counting, desk=receiving, secret=secret)
        _introduce(settings)
        wired = wire(settings, os.environ)
        stack.enter_context(_logging_to(folder / LOG, wired))
        store = stack.enter_context(open_store(wired.database))
        upgrade(store)
        ending = tell_story(wired, Stage(store, clock, almanac, arrivals), ends)
    return _conclude(ending, settings, seconds)


@contextmanager
def _logging_to(path: Path, wired: Wired) -> Iterator[None]:
    """Log lines into a file, so that the screen is left to the story."""
    root, before = logging.getLogger(), logging.getLogger().handlers[:]
    with path.open("a", encoding="utf-8") as file:
        configure(wired.log_form, wired.log_level, stream=file)
        try:
            yield
        finally:
            root.handlers[:] = before


def _introduce(settings: Path) -> None:
    screen.heading(f"A minute in the life of {HOUSE}")
    screen.say(
        f"{HOUSE} is invented, and so are its {len(SHOWS)} shows and all their counts. Nothing leaves this "
        f"machine. The settings, written just now to {settings}:"
    )
    screen.say()
    screen.say_as_it_is(settings.read_text(encoding="utf-8"))
    screen.heading("What the daemon does")
    screen.say(
        f"It is the one that `knickpoint run` starts, and reads the counts every {EVERY_HOURS} hours; its "
        f"log lines go to {settings.parent / LOG}. Only its clock is fast: a day takes a second."
    )
    screen.say()


def _conclude(ending: Ending, settings: Path, seconds: float) -> int:
    arrived = ending.alerts_for(FALLING_SHOW)
    screen.say()
    screen.say(_sum(ending) if arrived else _what_failed(ending, settings.parent / LOG, seconds))
    _what_next(settings)
    return Exit.GOOD if arrived else Exit.TROUBLE


def _sum(ending: Ending) -> str:
    number = len(ending.alerts_for(FALLING_SHOW))
    quiet = "" if ending.alerts_for(HIT_SHOW) else f" The runaway hit of {HIT_SHOW.name} rang nobody."
    return f"Alerts about {FALLING_SHOW.name} that arrived: {number}.{quiet}"


def _what_failed(ending: Ending, log: Path, seconds: float) -> str:
    errors = log.read_text(encoding="utf-8").count(" level=error ")
    advice = f"{log} has {errors} errors" if errors else "give it more time with --seconds"
    return (
        f"No alert about {FALLING_SHOW.name} arrived within {seconds:.0f} seconds: {ending.reached}; "
        f"{advice}."
    )


def _what_next(settings: Path) -> None:
    program = program_name()
    screen.heading("Ask what it stored (the counting service has ended, the database is still there)")
    screen.commands(about_the_demo(program, settings))
    screen.heading("Your own counts")
    screen.commands(about_your_own(program))
