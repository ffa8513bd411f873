"""A look back as sentences. Pure."""

from collections.abc import Sequence

from detectors.posterior import Quantiles
from service.replay.looking_back import ShiftLine
from service.replay.report import Report
from service.tell.effect import moved_words

LOOKING_BACK = (
    "Looking back, with all counts known (what was noticed at the time, and the rows below, are filtered):"
)


def look_back_sentences(report: Report) -> list[str]:
    """One sentence for each shift, or one that there is none; nothing where nobody looked back."""
    if report.lookback is None:
        return []
    shifts = report.lookback.shifts
    if not shifts:
        return [LOOKING_BACK, "No shift stands out."]
    return [LOOKING_BACK, *(_shift_sentence(shift, report) for shift in shifts)]


def rows_words(rows: Sequence[int]) -> str:
    """Such as "rows 29 to 31 and 34"."""
    stretches: list[list[int]] = []
    for row in rows:
        if stretches and row == stretches[-1][-1] + 1:
            stretches[-1].append(row)
        else:
            stretches.append([row])
    words = [str(one[0]) if len(one) == 1 else f"{one[0]} to {one[-1]}" for one in stretches]
    listed = words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"
    return f"{'row' if len(rows) == 1 else 'rows'} {listed}"


def _shift_sentence(shift: ShiftLine, report: Report) -> str:
    unit = report.interval if report.shape == "calendar" and report.interval else "release"
    moved = moved_words(Quantiles(*shift.level_before), Quantiles(*shift.level_after))
    low, _, high = shift.effect
    return (
        f"The level {moved} counts per {unit} (after / before, 90 %: {low:.2f} to {high:.2f}), most probably "
        f"from {report.observations[shift.index].at} (row {shift.index}; with {shift.region_probability:.2f} "
        f"in {rows_words(shift.region)}); probability of a shift around there {_chance(shift.probability)}."
    )


def _chance(probability: float) -> str:
    return "above 0.99" if probability > 0.99 else f"{probability:.2f}"
