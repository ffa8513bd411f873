"""From a table to the answer."""

from collections.abc import Callable

from detectors.judge import Rule
from detectors.model import Model
from service.replay.axis import Spacing, put_on_axis
from service.replay.looking_back import Looking, not_looking
from service.replay.report import Report, report
from service.replay.run import replay
from service.replay.table import Table


def replay_table(
    table: Table,
    spacing: Spacing,
    model: Model,
    rule: Rule,
    *,
    step: Callable[[int], None],
    looking: Looking = not_looking,
) -> Report:
    """Replay a table; `step` is told of each row folded, and `looking` is how to look back afterwards.

    Raises
    ------
    UnusableInterval, ReplayError, UnusableParameter
        If no axis fits the rows, or the rule does not fit the model.
    """
    axis = put_on_axis(table, spacing)
    interval = None if axis.interval is None else str(axis.interval)
    replayed = replay(axis.placed, model, rule, step=step)
    lookback = looking(axis.placed, table.rows, model)
    return report(table, axis.shape, interval, replayed, lookback, model, rule)
