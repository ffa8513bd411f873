"""A message that says it is a trial, to see whether an outlet works."""

import json
import secrets
from dataclasses import asdict, dataclass
from datetime import UTC, datetime
from typing import Annotated, Literal

from pydantic import Field

from service.outlets.outlet import Kind, Outcome, Outlet

SENTENCE = (
    "This is a trial: nothing has moved, and nothing needs doing. An alert reads like this, here with an "
    "invented show and invented figures: Example Show: the filtered level fell by about 40 %, from about "
    "1,050 to about 640 counts per week, most probably from 2026-03-02 (90 %: between 2026-02-23 and "
    "2026-03-09); probability of a recent shift 0.96."
)
CAUTION = "The show and its figures are invented; decide nothing by them."


@dataclass(frozen=True, slots=True)
class Trial:
    """One message that says it is a trial. What it shares with an alert has the same names."""

    type: Literal["trial"]
    schema: Literal[1]
    id: Annotated[str, Field(description="Also in the header webhook-id.")]
    composed: Annotated[str, Field(description="An instant in UTC, as RFC 3339 writes it, ending in Z.")]
    sentence: str
    caution: str
    outlet: Annotated[str, Field(description="The outlet's name in the settings.")]


@dataclass(frozen=True, slots=True)
class Tried:
    """What came of a trial, with a sentence for people."""

    outlet: str
    taken: bool
    status: int | None
    sentence: str


def try_outlet(outlet: Outlet, now: datetime) -> Tried:
    """Send one marked trial. Nothing is stored and nothing is tried again."""
    delivery_id = f"trial_{secrets.token_hex(12)}"
    outcome = outlet.send(delivery_id, trial_body(outlet.name, delivery_id, now), now)
    return Tried(outlet.name, outcome.kind is Kind.DELIVERED, outcome.status, _sentence(outlet.name, outcome))


def trial_body(outlet: str, delivery_id: str, now: datetime) -> bytes:
    """The bytes of a trial."""
    composed = now.astimezone(UTC).isoformat(timespec="seconds").replace("+00:00", "Z")
    trial = Trial("trial", 1, delivery_id, composed, SENTENCE, CAUTION, outlet)
    return json.dumps(asdict(trial), sort_keys=True, ensure_ascii=False).encode("utf-8", "replace")


def _sentence(name: str, outcome: Outcome) -> str:
    if outcome.kind is Kind.DELIVERED:
        return f'Outlet "{name}" took the trial (status {outcome.status}).'
    return outcome.error or f'Outlet "{name}" did not take the trial.'
