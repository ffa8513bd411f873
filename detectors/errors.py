"""What can be wrong with what the numerics are given. Each error writes its own sentence."""


class DetectorError(ValueError):
    """Base of all errors of this package."""


class UnusableObservation(DetectorError):
    """An observation has a value that no count can have."""

    def __init__(self, field: str, got: object, needed: str) -> None:
        self.field, self.got, self.needed = field, got, needed
        super().__init__(f"{field} must be {needed}; got {got!r}.")


class UnusableParameter(DetectorError):
    """A parameter of the model lies outside its range."""

    def __init__(self, name: str, got: object, needed: str) -> None:
        self.name, self.got, self.needed = name, got, needed
        super().__init__(f"{name} must be {needed}; got {got!r}.")


class NotInOrder(DetectorError):
    """An observation does not lie after the one before it."""

    def __init__(self, before: int, got: int) -> None:
        self.before, self.got = before, got
        super().__init__(f"Observations must come in order: position {got} does not lie after {before}.")


class UnreadableCheckpoint(DetectorError):
    """Checkpoint bytes are damaged or of a version that this program does not read."""

    def __init__(self, why: str) -> None:
        self.why = why
        super().__init__(f"The checkpoint cannot be read: {why}. Fold the stream again from its readings.")
