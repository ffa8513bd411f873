"""The alerts of a replay as sentences. Pure."""

from detectors.posterior import Quantiles
from service.replay.report import AlertLine, Report
from service.tell.effect import moved_words
from service.tell.words import probability_words

CAUTION = (
    "Filtered levels rest on the counts that had come by then. A date in common is not a cause, and a "
    "decision about people's work needs more than a chart."
)


def alert_sentence(alert: AlertLine, report: Report) -> str:
    """What moved, by how much and since when, and when it was noticed: in the words of an alert."""
    start, announced = (_place(report, index) for index in (alert.start_index, alert.announced_index))
    moved = moved_words(Quantiles(*alert.level_before), Quantiles(*alert.level_after))
    return (
        f"The filtered level {moved} counts per {_unit(report)}, most probably from {start}; noticed at "
        f"{announced}; {probability_words(alert.probability)}."
    )


def summary_sentence(report: Report) -> str:
    """How many counts there were, and how many alerts."""
    counts = sum(line.count is not None for line in report.observations)
    missing = len(report.observations) - counts
    rows = f"{counts} counts" + (f", {missing} missing or kept out" if missing else "")
    spacing = f"one per {_unit(report)}"
    alerts = {0: "no alert", 1: "1 alert"}.get(len(report.alerts), f"{len(report.alerts)} alerts")
    return f"{rows}, {spacing}: {alerts}."


def too_short_sentence(report: Report) -> str | None:
    """That there are not enough counts to say anything, where that is so."""
    fewest = report.judgement["fewest_counts"]
    counts = sum(line.count is not None for line in report.observations)
    if not isinstance(fewest, int) or counts >= fewest:
        return None
    return f"Too short to say: {counts} counts, and nothing rings before {fewest}."


def _place(report: Report, index: int) -> str:
    return f"{report.observations[index].at} (row {index})"


def _unit(report: Report) -> str:
    return report.interval if report.shape == "calendar" and report.interval else "release"
