"""How closely the filter must compute for a rule. The daemon and `replay` ask alike, so they ring alike."""

from detectors.accuracy import Accuracy


def accuracy_for(window: int) -> Accuracy:
    """The usual accuracy, with all runs within the window kept one by one."""
    return Accuracy(exact_run_length=max(window, Accuracy().exact_run_length))
