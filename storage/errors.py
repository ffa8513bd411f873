"""What can go wrong with the store. Each error writes its own sentence."""

_SHOWN_AT_MOST = 200


class StoreError(Exception):
    """Base of all errors of this package."""


class UnsupportedAddress(StoreError):
    """The address names a kind of database that this program does not open."""

    def __init__(self, kind: str, why: str) -> None:
        self.kind, self.why = kind, why
        super().__init__(f"The database must be a file for SQLite; got {kind}: {why}. Give a path to a file.")


class StoreUnusable(StoreError):
    """The database cannot be opened, read or written."""

    def __init__(self, place: str, why: str, remedy: str) -> None:
        self.place, self.why, self.remedy = place, why, remedy
        super().__init__(f"The database {place} cannot be used: {why}. {remedy}")


class StoreMissing(StoreError):
    """There is no database file at the address."""

    def __init__(self, place: str) -> None:
        self.place = place
        super().__init__(f"There is no database at {place}. Check the path, or create it by a first round.")


class StoreBusy(StoreError):
    """Another writer kept the database for longer than we wait."""

    def __init__(self, place: str, waited_seconds: float) -> None:
        self.place, self.waited_seconds = place, waited_seconds
        super().__init__(
            f"The database {place} was kept busy by another writer for over {waited_seconds:g} seconds. "
            "Nothing was written; try again."
        )


class NestedWriting(StoreError):
    """A thread asked for a second write transaction while its first is open."""

    def __init__(self) -> None:
        super().__init__("This thread has a write transaction open already; pass its connection on instead.")


class ForeignDatabase(StoreError):
    """The file is a database of another program."""

    def __init__(self, place: str, tables: tuple[str, ...]) -> None:
        self.place, self.tables = place, tables
        super().__init__(
            f"The database {place} holds tables that are not ours ({', '.join(tables[:3])}). "
            "Nothing was changed; give the path to a file of its own."
        )


class SchemaTooOld(StoreError):
    """The database has not been migrated to this program's tables."""

    def __init__(self, place: str, found: str | None, needed: str) -> None:
        self.place, self.found, self.needed = place, found, needed
        super().__init__(
            f"The database {place} has {_tables(found)}; this program needs {needed}. Migrate it first."
        )


class SchemaTooNew(StoreError):
    """The database was migrated by a newer program."""

    def __init__(self, place: str, found: str, newest: str) -> None:
        self.place, self.found, self.newest = place, found, newest
        super().__init__(
            f"The database {place} has {_tables(found)}, this program knows them up to {newest}. "
            "Nothing was changed; use the newer program, or a copy of the database from before its upgrade."
        )


class MigrationBroken(StoreError):
    """A migration would have left rows that point nowhere; it was taken back."""

    def __init__(self, place: str, tables: tuple[str, ...]) -> None:
        self.place, self.tables = place, tables
        super().__init__(
            f"Migrating {place} would leave rows that point nowhere (in {', '.join(tables)}). "
            "It was taken back, nothing was changed; please report this."
        )


class UnstorableValue(StoreError, ValueError):
    """A value has no faithful form in the store."""

    def __init__(self, needed: str, got: object) -> None:
        self.needed, self.got = needed, got
        super().__init__(f"The store needs {needed}; got {_shown(got)}.")


class DamagedHistory(StoreError):
    """The stored bytes of a run-length posterior cannot be read."""

    def __init__(self, why: str) -> None:
        self.why = why
        super().__init__(f"The stored run-length posterior cannot be read: {why}. Rebuild the stream.")


class DamagedRow(StoreError):
    """A stored value does not have the form this program writes."""

    def __init__(self, needed: str, got: object) -> None:
        self.needed, self.got = needed, got
        super().__init__(
            f"A stored value should be {needed}, but is {_shown(got)}. "
            "The database was changed by hand or is damaged; restore a copy."
        )


class HeadMoved(StoreError):
    """A stream got new readings or a new epoch since it was read; fold it again."""

    def __init__(self, stream_id: str, expected: object, found: object) -> None:
        self.stream_id, self.expected, self.found = stream_id, expected, found
        super().__init__(
            f"Stream {stream_id} has moved on since it was read (expected {expected}, found {found}). "
            "Nothing was written; read and fold it again."
        )


class NoSuchRow(StoreError, LookupError):
    """Nothing is stored under this id."""

    def __init__(self, kind: str, id: object) -> None:
        self.kind, self.id = kind, id
        super().__init__(f"There is no {kind} with the id {id!r} in the store.")


class KeyTwice(StoreError, ValueError):
    """One document gives two different values for one key of a stream."""

    def __init__(self, stream_id: str, key: str) -> None:
        self.stream_id, self.key = stream_id, key
        super().__init__(
            f"Stream {stream_id} was given two different readings for {key!r} at once. "
            "Keep both out, or give one."
        )


def _tables(version: str | None) -> str:
    return "no tables yet" if version is None else f"tables of version {version}"


def _shown(value: object) -> str:
    text = repr(value)
    return text if len(text) <= _SHOWN_AT_MOST else text[:_SHOWN_AT_MOST] + " ..."
