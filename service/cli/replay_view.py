"""A replay as people read it: what was noticed first, then the counts at a glance, then row by row."""

from detectors.posterior import Quantiles
from service.cli.figures import LEVEL_COLUMN, probability_text, quantiles_text
from service.cli.show import Cell, blocks, say, show_table, width
from service.cli.sparkline import sparkline
from service.replay.looking_back_words import look_back_sentences
from service.replay.report import ObservationLine, Report
from service.replay.words import CAUTION, alert_sentence, summary_sentence, too_short_sentence

COLUMNS = ("row", "at", "count", "shift", "run", LEVEL_COLUMN, "one-off", "log p", "pit")
LEGEND = (
    "level: as filtered from the counts so far; shift: probability of a recent shift not announced yet; "
    "run: most probable run length, in counts; one-off: probability that the count is one; log p: log "
    "probability of the count, given those before it; pit: predictive distribution function just below and "
    "at the count."
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
    for sentence in look_back_sentences(report):
        say(sentence)
    if report.alerts or report.lookback is not None:
        say(CAUTION)
    say("")
    say(sparkline([line.count for line in report.observations], width(), blocks()))
    say("")
    say(LEGEND)
    say("")
    show_table(COLUMNS, [_cells(line) for line in report.observations])


def pit_text(pit: tuple[float, float]) -> str:
    """Both bounds, or one where they are the same to three places."""
    bounds = dict.fromkeys(f"{bound:.3f}" for bound in pit)
    return " to ".join(bounds)


def _cells(line: ObservationLine) -> list[Cell]:
    return [
        line.index,
        line.at,
        line.count,
        _probability(line.recent_shift),
        line.run_length_mode,
        None if line.level is None else quantiles_text(Quantiles(*line.level)),
        _probability(line.one_off),
        line.log_predictive,
        None if line.pit is None else pit_text(line.pit),
    ]


def _probability(value: float | None) -> Cell:
    return None if value is None else probability_text(value)
