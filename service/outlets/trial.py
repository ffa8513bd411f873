"""A message that says it is a trial, to see whether an outlet works."""

import json
import secrets
from dataclasses import dataclass
from datetime import UTC, datetime

from service.outlets.outlet import Kind, Outcome, Outlet

TRIAL_TYPE = "trial"
SENTENCE = "This is a trial of an outlet: nothing has moved, and nothing needs doing."


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
    outcome = outlet.send(delivery_id, trial_body(outlet.name, now), now)
    return Tried(outlet.name, outcome.kind is Kind.DELIVERED, outcome.status, _sentence(outlet.name, outcome))


def trial_body(outlet: str, now: datetime) -> bytes:
    """The bytes of a trial, in the envelope of an alert."""
    document = {
        "type": TRIAL_TYPE,
        "schema_version": 1,
        "timestamp": now.astimezone(UTC).isoformat().replace("+00:00", "Z"),
        "data": {"sentence": SENTENCE, "outlet": outlet},
    }
    return json.dumps(document, sort_keys=True, ensure_ascii=False).encode("utf-8", "replace")


def _sentence(name: str, outcome: Outcome) -> str:
    if outcome.kind is Kind.DELIVERED:
        return f'Outlet "{name}" took the trial (status {outcome.status}).'
    return outcome.error or f'Outlet "{name}" did not take the trial.'
