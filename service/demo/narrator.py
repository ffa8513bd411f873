"""Tells what the daemon did, each thing once and in the order in which it happened. Knows the story; pure."""

import datetime
from collections.abc import Iterator
from dataclasses import dataclass, field

from service.demo.place import stream_id
from service.demo.seen import Seen
from service.demo.story import FALL, FALLING_SHOW, HIT, HIT_SHOW, SHOWS, UNIT, Almanac
from storage.posteriors import StoredPosterior
from storage.rounds import FAILED, GOOD, NOTHING_NEW, Round
from storage.shifts import Shift

SUMMED_UP_AFTER = datetime.timedelta(days=6)
TITLES = {stream_id(show.name): show.name for show in SHOWS}


@dataclass
class Narrator:
    """Keeps what has been told."""

    almanac: Almanac
    _rounds_told: int = 0
    _told: set[str] = field(default_factory=set)

    def lines(self, seen: Seen) -> Iterator[str]:
        """What has not been told yet."""
        if not seen.rounds:
            return
        if self._first("first poll"):
            yield _first_poll(seen.rounds[0])
            self._rounds_told = 1
        if seen.folded == len(SHOWS) and self._first("history"):
            yield _history(seen.found_in_history)
        yield from self._rounds(seen.rounds)
        yield from self._hit(seen)
        yield from self._fall(seen)
        for shift in seen.live:
            if self._first(shift.id):
                yield _announced(shift)

    def _rounds(self, rounds: tuple[Round, ...]) -> Iterator[str]:
        untold = rounds[self._rounds_told :]
        if untold and untold[-1].started_utc - untold[0].started_utc >= SUMMED_UP_AFTER:
            self._rounds_told = len(rounds)
            yield rounds_words(untold)

    def _hit(self, seen: Seen) -> Iterator[str]:
        day = self.almanac.date(HIT.day)
        if day in seen.hit and self._first("hit"):
            rang = any(shift.stream_id == stream_id(HIT_SHOW.name) for shift in seen.live)
            yield hit_words(day, seen.hit[day], rang)

    def _fall(self, seen: Seen) -> Iterator[str]:
        """Day by day from the fall on, until it is announced."""
        begun = self.almanac.date(FALL.day)
        announced = [one.announced_key for one in seen.live if one.stream_id == stream_id(FALLING_SHOW.name)]
        for day, said in seen.fall.items():
            if day < begun or (announced and said.key > announced[0]) or not self._first(said.key):
                continue
            if day == begun:
                yield (
                    f"From {day} on the counting service has only {100 * FALL.times:.0f} % as many for "
                    f"{FALLING_SHOW.name}; the daemon is not told."
                )
            yield (
                f"{FALLING_SHOW.name}: {said.count:,} {UNIT} on {day}; "
                f"probability of a recent shift {said.recent_shift:.2f}."
            )

    def _first(self, what: str) -> bool:
        """Whether this was not told before; from now on it was."""
        if what in self._told:
            return False
        self._told.add(what)
        return True


def reached_words(seen: Seen) -> str:
    """How far the daemon came."""
    if not seen.rounds:
        return "no round ended"
    newest = max((str(day) for day in seen.fall), default="the history only")
    return f"the daemon made {len(seen.rounds)} rounds, and had folded the counts up to {newest}"


def rounds_words(rounds: tuple[Round, ...]) -> str:
    """Several rounds in one sentence."""
    new = sum(one.stored for one in rounds)
    unchanged = sum(one.outcome == NOTHING_NEW for one in rounds)
    failed = sum(one.outcome not in (GOOD, NOTHING_NEW) for one in rounds)
    trouble = f"; {failed} rounds failed" if failed else ""
    return (
        f"Polled {len(rounds)} times since {rounds[0].started_utc.date()}: {new} new counts; "
        f"{unchanged} times the counting service said that nothing had changed{trouble}."
    )


def hit_words(day: datetime.date, said: StoredPosterior, rang: bool) -> str:
    """The runaway hit, and what the filter took it for."""
    facts = f"{HIT_SHOW.name}: {said.count:,} {UNIT} on {day}, where about {said.level.mid:,.0f} are usual"
    if rang or said.one_off < 0.5:
        return f"{facts}; a one-off with probability {said.one_off:.2f}."
    return (
        f"{facts}: counted as a one-off (probability {said.one_off:.2f}), no alert. "
        f"Probability of a recent shift: {said.recent_shift:.2f}."
    )


def _first_poll(first: Round) -> str:
    if first.outcome == FAILED:
        return f"The first poll failed: {first.message}"
    return f"First poll: {first.stored:,} counts of {len(SHOWS)} shows are read and kept."


def _history(found: tuple[Shift, ...]) -> str:
    if not found:
        return "History folded: no shift found in it."
    listed = "; ".join(f"{TITLES.get(one.stream_id)} {_moved(one)} about {one.start_key}" for one in found)
    return (
        f"History folded. Shifts found in it are recorded, and nobody is told: {listed} "
        "(levels as filtered then)."
    )


def _announced(shift: Shift) -> str:
    return (
        f"{TITLES.get(shift.stream_id)}: {shift.probability:.2f} lies above the threshold, so the shift is "
        "announced, and its alert waits in the outbox."
    )


def _moved(shift: Shift) -> str:
    before, after = shift.level_before.mid, shift.level_after.mid
    return f"{'rose' if after > before else 'fell'} from about {before:,.0f} to {after:,.0f}"
