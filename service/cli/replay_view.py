"""A replay as people read it: what was noticed first, then the counts at a glance, then row by row."""

from service.cli.show import Cell, blocks, say, show_table, width
from service.cli.sparkline import sparkline
from service.replay.report import ObservationLine, Report
from service.replay.words import CAUTION, alert_sentence, level_text, summary_sentence, too_short_sentence

COLUMNS = (
    "row",
    "at",
    "count",
    "recent shift",
    "run length",
    "level (5 to 95 %)",
    "one-off",
    "log predictive",
    "pit",
)


def show_report(report: Report) -> None:
    """Print the whole answer."""
    say(summary_sentence(report))
    for sentence in filter(None, [too_short_sentence(report)]):
        say(sentence)
    for alert in report.alerts:
        say(alert_sentence(alert, report))
    for line in report.kept_out:
        say(f"Row {line.index} was kept out: {line.why}")
    if report.alerts:
        say(CAUTION)
    say("")
    say(sparkline([line.count for line in report.observations], width(), blocks()))
    say("")
    show_table(COLUMNS, [_cells(line) for line in report.observations])


def _cells(line: ObservationLine) -> list[Cell]:
    return [
        line.index,
        line.at,
        line.count,
        _probability(line.recent_shift),
        line.run_length_mode,
        None if line.level is None else level_text(line.level),
        _probability(line.one_off),
        line.log_predictive,
        None if line.pit is None else " to ".join(f"{bound:.3f}" for bound in line.pit),
    ]


def _probability(value: float | None) -> Cell:
    return None if value is None else f"{value:.3f}"
