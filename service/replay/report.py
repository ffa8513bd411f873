"""What a replay says, in the form in which it is printed. Pure."""

from dataclasses import dataclass

from detectors.judge import Rule
from detectors.model import Model
from detectors.posterior import Announcement, Posterior, Quantiles
from service.replay.looking_back import LookBackLines
from service.replay.run import Replayed, indices
from service.replay.table import Entry, Table
from service.sources.document import KeptOut

Triple = tuple[float, float, float]


@dataclass(frozen=True, slots=True)
class ObservationLine:
    """One row of the file. What is not known of it is None: all of it where the count is missing."""

    index: int
    at: str | None
    count: int | None
    recent_shift: float | None = None
    run_length_mode: int | None = None
    level: Triple | None = None
    one_off: float | None = None
    log_predictive: float | None = None
    pit: tuple[float, float] | None = None


@dataclass(frozen=True, slots=True)
class AlertLine:
    """A shift that would have been told. Indices are those of the file's rows; levels are filtered ones."""

    announced_index: int
    start_index: int
    probability: float
    level_before: Triple
    level_after: Triple


@dataclass(frozen=True, slots=True)
class KeptOutLine:
    """A row that was not used, and why."""

    index: int
    why: str
    text: str


@dataclass(frozen=True, slots=True)
class Report:
    """The whole answer. `interval` is None where the rows are releases without a common spacing.

    Observations and alerts hold filtered figures, as they would have been said at the time; `lookback`, where
    it was asked for, what all counts together say.
    """

    shape: str
    interval: str | None
    observations: tuple[ObservationLine, ...]
    alerts: tuple[AlertLine, ...]
    kept_out: tuple[KeptOutLine, ...]
    log_evidence: float
    judgement: dict[str, object]
    model: dict[str, object]
    lookback: LookBackLines | None


def report(
    table: Table,
    shape: str,
    interval: str | None,
    replayed: Replayed,
    lookback: LookBackLines | None,
    model: Model,
    rule: Rule,
) -> Report:
    """The answer to a replay, its observations in the order of the file."""
    said = {one.index: posterior for one, posterior in zip(replayed.placed, replayed.posteriors, strict=True)}
    lines = [observation_line(entry, said[entry.index]) for entry in table.entries]
    lines += [ObservationLine(one.row - 1, None, None) for one in table.kept_out]
    rows = indices(replayed.placed)
    return Report(
        shape,
        interval,
        tuple(sorted(lines, key=lambda line: line.index)),
        tuple(alert_line(announcement, rows) for announcement in replayed.announcements),
        tuple(map(_kept_out_line, table.kept_out)),
        sum(posterior.log_predictive for posterior in replayed.posteriors if posterior is not None),
        _judgement(rule),
        _model(model),
        lookback,
    )


def observation_line(entry: Entry, posterior: Posterior | None) -> ObservationLine:
    """One row with what was said of it."""
    if posterior is None:
        return ObservationLine(entry.index, entry.at.isoformat(), entry.count)
    return ObservationLine(
        entry.index,
        entry.at.isoformat(),
        entry.count,
        posterior.recent_shift,
        posterior.run_length_mode,
        triple(posterior.level),
        posterior.one_off,
        posterior.log_predictive,
        posterior.pit,
    )


def alert_line(announcement: Announcement, rows: dict[int, int]) -> AlertLine:
    """An announcement with its places in the file."""
    return AlertLine(
        rows[announcement.position],
        rows[announcement.start_position],
        announcement.probability,
        triple(announcement.level_before),
        triple(announcement.level_after),
    )


def triple(level: Quantiles) -> Triple:
    """The 5 %, 50 % and 95 % quantiles."""
    return (level.low, level.mid, level.high)


def _kept_out_line(one: KeptOut) -> KeptOutLine:
    return KeptOutLine(one.row - 1, one.why, one.text)


def _judgement(rule: Rule) -> dict[str, object]:
    return {
        "threshold": rule.threshold,
        "window": rule.window,
        "lasting": rule.lasting,
        "fewest_counts": rule.fewest_counts,
    }


def _model(model: Model) -> dict[str, object]:
    return {
        "mean_gap": model.gap.mean,
        "gap_shape": model.gap.shape,
        "one_off_share": model.one_off_share,
        # JSON has no infinity; the word is what settings and --dispersion have for the Poisson limit.
        "dispersions": tuple("poisson" if value == float("inf") else value for value in model.dispersions),
        "wanders": model.wanders,
    }
