"""The alerts of a replay as sentences. Pure."""

from service.replay.report import AlertLine, Report

CAUTION = (
    "Levels are filtered figures with their 5 % and 95 % quantiles. A date in common is not a cause, and a "
    "decision about people's work needs more than a chart."
)


def alert_sentence(alert: AlertLine, report: Report) -> str:
    """What moved, by how much and since when, and when it was noticed."""
    start, announced = (_place(report, index) for index in (alert.start_index, alert.announced_index))
    change = alert.level_after[1] / alert.level_before[1] - 1.0
    moved = "rose" if change > 0.0 else "fell"
    return (
        f"The level {moved} by about {_percent(abs(change))}, from {level_text(alert.level_before)} to "
        f"{level_text(alert.level_after)}, most probably from {start} on; noticed at {announced} with "
        f"probability {alert.probability:.3f}."
    )


def level_text(level: tuple[float, float, float]) -> str:
    """A level with its range."""
    low, mid, high = (
        f"{value:,.0f}".replace(",", " ") if value >= 100 else f"{value:.3g}" for value in level
    )
    return f"{mid} ({low} to {high})"


def summary_sentence(report: Report) -> str:
    """How many counts there were, and how many alerts."""
    counts = sum(line.count is not None for line in report.observations)
    missing = len(report.observations) - counts
    rows = f"{counts} counts" + (f", {missing} missing or kept out" if missing else "")
    spacing = f"one per {report.interval}" if report.shape == "calendar" else "one per release"
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


def _percent(share: float) -> str:
    return f"{share * 100:.0f} %" if share < 10.0 else f"{share + 1:.3g} times"
