"""Why a file cannot be replayed. Each error writes its own sentence."""


class ReplayError(ValueError):
    """Base of all errors of this package."""


class NothingToReplay(ReplayError):
    """No row of the file can be used."""

    def __init__(self, path: object, kept_out: int) -> None:
        self.path, self.kept_out = path, kept_out
        rows = (
            f"none of its {kept_out} rows can be used" if kept_out else "it has no rows below its header line"
        )
        super().__init__(f"{path} cannot be replayed: {rows}. Needed are the columns at and count.")


class SamePlace(ReplayError):
    """Two rows stand for one interval or one release."""

    def __init__(self, first: int, second: int, place: str, remedy: str) -> None:
        self.first, self.second, self.place = first, second, place
        super().__init__(f"The rows with index {first} and {second} both stand for {place}. {remedy}")


class NoSpacing(ReplayError):
    """The rows are spaced so that no interval fits."""

    def __init__(self, why: str) -> None:
        self.why = why
        super().__init__(f"No interval can be inferred: {why}. Name it with --interval.")
