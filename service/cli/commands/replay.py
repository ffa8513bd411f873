"""`knickpoint replay`: a record run through the detector as if it arrived one count at a time."""

from pathlib import Path

import click

from service.cli.options import json_option


@click.command("replay", short_help="Run the counts of a CSV file through the detector.")
@click.argument("file", type=click.Path(path_type=Path, dir_okay=False, allow_dash=True))
@json_option
@click.option(
    "--interval",
    help='What a count covers: hour, day, week, month, year or a number of days such as "14 days". '
    "Without it, the commonest spacing of the rows; with a column release, each row is one release.",
)
@click.option(
    "--zone",
    help="Zone of date-times, such as Europe/Berlin. Without it, dates are taken as they are written.",
)
@click.option("--threshold", type=float, help="Probability of a recent shift that rings.")
@click.option("--window", type=int, help="Longest run length that is recent, in counts.")
@click.option("--lasting", type=int, help="Shortest run length that may ring, in counts.")
@click.option("--fewest-counts", type=int, help="With fewer counts than this nothing rings.")
@click.option("--mean-gap", type=float, help="Mean length of a run, in intervals or releases.")
@click.option("--gap-shape", type=int, help="Shape of the prior of that length; 1 is a constant hazard.")
@click.option("--smallest-shift", type=float, help="Smallest shift worth hearing about; 0.15 is 15 %.")
@click.option("--one-off-share", type=float, help="Share of counts that are one-offs, from 0 to below 1.")
@click.option("--wander", help='Values of the wander with prior weights: "0" or "0.005:1,0.01:0.5".')
@click.option("--dispersion", help='Values of the dispersion: "4,8,16"; "poisson" stands for infinity.')
@click.option(
    "--look-back",
    is_flag=True,
    help="Also say what all counts together show: each shift with its date region and effect. "
    "With --json this is there without asking, up to 1000 rows.",
)
def command(
    file: Path,
    as_json: bool,
    interval: str | None,
    zone: str | None,
    threshold: float | None,
    window: int | None,
    lasting: int | None,
    fewest_counts: int | None,
    mean_gap: float | None,
    gap_shape: int | None,
    smallest_shift: float | None,
    one_off_share: float | None,
    wander: str | None,
    dispersion: str | None,
    look_back: bool,
) -> None:
    """Run the counts of FILE (- for standard input) through the detector, as if they arrived one at a time.

    FILE is a CSV table with the columns at (a date or date-time of ISO 8601) and count, and optionally
    release and exposure. An empty count is a missing one and keeps its row; an empty exposure is 1. Rows may
    stand in any order: they are taken by date, and answered in the order of the file.
    """
    from time import monotonic

    from service.cli.replay_view import show_report
    from service.cli.show import progress, show_json
    from service.replay.axis import Spacing
    from service.replay.given import file_given
    from service.replay.looking_back import looked_back, looking_if_quick, not_looking
    from service.replay.parameters import Wish, model_for, read_dispersions, read_wanders, read_zone, rule_for
    from service.replay.table import read_table
    from service.replay.whole import replay_table

    wish = Wish(
        threshold=threshold,
        window=window,
        lasting=lasting,
        fewest_counts=fewest_counts,
        mean_gap=mean_gap,
        gap_shape=gap_shape,
        smallest_shift=smallest_shift,
        one_off_share=one_off_share,
        wanders=None if wander is None else read_wanders(wander),
        dispersions=None if dispersion is None else read_dispersions(dispersion),
    )
    model, rule = model_for(wish), rule_for(wish)
    spacing = Spacing(interval, None if zone is None else read_zone(zone))
    with file_given(file) as place:
        table = read_table(place, spacing.zone, monotonic)
    unasked = looking_if_quick if as_json else not_looking
    looking = looked_back if look_back else unasked
    with progress("Replaying", len(table.entries)) as step:
        answer = replay_table(table, spacing, model, rule, step=step, looking=looking)
    if as_json:
        show_json(answer)
    else:
        show_report(answer)
