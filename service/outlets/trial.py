"""A message that says it is a trial, to see whether an outlet works."""

import json
import secrets
from dataclasses import dataclass
from datetime import UTC

from service.clock import Clock
from service.outlets.outlet import Kind, Outcome, Outlet

TRIAL_TYPE = "trial"
SENTENCE = (
    "This is a trial: nothing has moved, and nothing needs doing. An alert would read like this, with figures "
    "that are invented here: Example Show: the filtered level fell by about 40 %, from about 1,050 to about "
    "640 counts per week, most probably from 2026-03-02."
)


@dataclass(frozen=True, slots=True)
class Tried:
    """What came of a trial, with a sentence for people."""

    outlet: str
    taken: bool
    status: int | None
    sentence: str


def try_outlet(outlet: Outlet, clock: Clock) -> Tried:
    """Send one marked trial. Nothing is stored and nothing is tried again."""
    delivery_id = f"trial_{secrets.token_hex(12)}"
    now = clock.now()
    document = {
        "type": TRIAL_TYPE,
        "schema": 1,
        "id": delivery_id,
        "composed": now.astimezone(UTC).isoformat().replace("+00:00", "Z"),
        "outlet": outlet.name,
        "sentence": SENTENCE,
    }
    body = json.dumps(document, sort_keys=True, ensure_ascii=False).encode("utf-8", "replace")
    outcome = outlet.send(delivery_id, body, now)
    return Tried(outlet.name, outcome.kind is Kind.DELIVERED, outcome.status, _sentence(outlet.name, outcome))


def _sentence(name: str, outcome: Outcome) -> str:
    if outcome.kind is Kind.DELIVERED:
        return f'Outlet "{name}" took the trial (status {outcome.status}).'
    return outcome.error or f'Outlet "{name}" did not take the trial.'
