"""One entry to all kinds of sources."""

from dataclasses import dataclass

from service.calls import Monotonic
from service.sources.csv_table import read_csv
from service.sources.document import Document, Validators
from service.sources.http_json import read_json
from service.sources.plans import CsvPlan, JsonPlan, SourcePlan, SqlPlan, fingerprint
from service.sources.sql_query import read_sql


@dataclass(frozen=True, slots=True)
class Tools:
    """What reading needs from the outside: the monotonic clock for deadlines, in real seconds."""

    monotonic: Monotonic


def read_document(plan: SourcePlan, validators: Validators, *, tools: Tools) -> Document:
    """Read a source's document, whole or not at all; the same one again only says so.

    Validators given under another plan are not used.

    Raises
    ------
    SourceUnreadable
        With one sentence that holds no secret.
    """
    usable = validators if validators.fingerprint == fingerprint(plan) else Validators()
    match plan:
        case JsonPlan():
            return read_json(plan, usable, tools.monotonic)
        case CsvPlan():
            return read_csv(plan, usable, tools.monotonic)
        case SqlPlan():
            return read_sql(plan, tools.monotonic)
