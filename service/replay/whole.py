"""From a table to the answer."""

from collections.abc import Callable

from detectors.judge import Rule
from detectors.model import Model
from service.replay.axis import Spacing, put_on_axis
from service.replay.report import Report, report
from service.replay.run import replay
from service.replay.table import Table


def replay_table(
    table: Table, spacing: Spacing, model: Model, rule: Rule, *, step: Callable[[int], None]
) -> Report:
    """Replay a table; `step` is told of each row folded.

    Raises
    ------
    UnusableInterval, ReplayError, UnusableParameter
        If no axis fits the rows, or the rule does not fit the model.
    """
    axis = put_on_axis(table, spacing)
    interval = None if axis.interval is None else str(axis.interval)
    return report(table, axis.shape, interval, replay(axis.placed, model, rule, step=step), model, rule)
