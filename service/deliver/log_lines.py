"""What delivering writes into the log: a line an attempt, and what is in its way."""

from collections.abc import Sequence

from service.deliver.attempt import GIVEN_UP, Report
from service.logs import log
from service.outlets.outlet import Kind


def log_report(report: Report) -> None:
    """One attempt. What is given up is an error: somebody should look at it."""
    write = {Kind.DELIVERED.value: log.info, GIVEN_UP: log.error}.get(report.outcome, log.warning)
    write(
        "delivery attempted",
        outlet=report.outlet,
        delivery=report.delivery_id,
        shift=report.shift_id,
        outcome=report.outcome,
        status=report.status,
        why=report.error,
        seconds=round(report.took_seconds, 3),
    )


def log_strays(outlets: Sequence[str], waiting: int) -> None:
    """Deliveries that nobody sends."""
    log.warning(
        "deliveries wait for outlets that are not in the settings",
        outlets=", ".join(outlets),
        waiting=waiting,
    )


def log_trouble(outlet: str, error: Exception) -> None:
    """A pass that could not be finished; called where the error is handled."""
    log.exception("delivering interrupted", outlet=outlet, kind=type(error).__name__)
