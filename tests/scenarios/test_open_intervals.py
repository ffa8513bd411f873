"""An interval that was open when its source was last read has a part of its count only, and is not folded."""

import datetime

from service.round.once import RoundOutcome
from service.work import catch_up, pass_for
from storage.rounds import FAILED


def _read_in_the_middle_of_a_week(world, counts: list[int]) -> None:
    """Ten weeks that are over, and an eighth part of the eleventh."""
    world.studio.weekly("quay", [*counts[:10], counts[10] // 8])
    world.at_week(9, hours=20)
    world.poll()
    assert [row.count for row in world.history()] == counts[:10]


def test_a_round_that_fails_after_the_end_of_an_interval_does_not_take_its_part_for_the_whole(
    world, counts_of
) -> None:
    counts = counts_of(1, (1000, 11))
    _read_in_the_middle_of_a_week(world, counts)
    world.at_week(10)
    world.studio.broken = (503, b"")
    assert pass_for(world.bench(), world.plan()).round.outcome == FAILED
    assert [row.count for row in world.history()] == counts[:10]
    world.studio.broken = None
    world.studio.weekly("quay", counts)
    world.poll()
    assert [row.count for row in world.history()] == counts


def test_nor_does_a_restart_before_its_first_round(world, counts_of) -> None:
    counts = counts_of(1, (1000, 11))
    _read_in_the_middle_of_a_week(world, counts)
    world.clock.instant += datetime.timedelta(days=30)
    assert catch_up(world.bench(), world.plan()) == ()
    assert [row.count for row in world.history()] == counts[:10]


def test_an_unchanged_document_after_the_end_says_that_the_count_is_whole(world, counts_of) -> None:
    counts = counts_of(1, (1000, 11))
    _read_in_the_middle_of_a_week(world, counts)
    world.at_week(10)
    outcome: RoundOutcome = world.read()
    assert outcome.outcome == "nothing new"
    assert [row.count for row in world.history()] == [*counts[:10], counts[10] // 8]
