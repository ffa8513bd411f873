"""Rounds and deliveries, for people and for machines. Pure."""

import json
from collections.abc import Sequence

from service.cli.json_form import instant_text
from service.cli.show import Cell
from storage.outbox import DELIVERED, WAITING, Attempt, Delivery
from storage.rounds import Round

ROUND_COLUMNS = (
    "round",
    "source",
    "started",
    "outcome",
    "stored",
    "unchanged",
    "absent",
    "kept out",
)
DELIVERY_COLUMNS = ("delivery", "outlet", "state", "attempts", "created")
ATTEMPT_COLUMNS = ("at", "outcome", "status", "seconds", "error")
ROUND_MAY_LACK = frozenset({"absent", "kept out"})
KEPT_OUT_COLUMNS = ("row", "why", "text")


def round_cells(one: Round) -> list[Cell]:
    """A line of `rounds`."""
    return [
        one.id,
        one.source,
        one.started_utc,
        one.outcome,
        one.stored,
        one.unchanged + one.held,
        one.absent,
        one.kept_out_count,
    ]


def round_json(one: Round) -> dict[str, object]:
    """A round with the rows that it kept out."""
    return {
        "id": one.id,
        "source": one.source,
        "started": one.started_utc,
        "ended": one.ended_utc,
        "outcome": one.outcome,
        "rows_used": one.rows_used,
        "stored": one.stored,
        "unchanged": one.unchanged,
        "held": one.held,
        "absent": one.absent,
        "kept_out_count": one.kept_out_count,
        "kept_out": one.kept_out,
        "message": one.message,
    }


def delivery_cells(one: Delivery) -> list[Cell]:
    """A line of `deliveries`."""
    return [one.id, one.outlet, one.state.replace("_", " "), one.attempts, one.created_utc]


def delivery_sentence(one: Delivery) -> str | None:
    """What is to be known of a delivery that has not arrived."""
    if one.state == DELIVERED:
        return None
    due = f"due at {instant_text(one.due_utc.replace(microsecond=0))}" if one.state == WAITING else "given up"
    return f"{one.id} is {due}{'.' if one.last_error is None else ': ' + one.last_error}"


def delivery_json(one: Delivery, attempts: Sequence[Attempt]) -> dict[str, object]:
    """A delivery with its attempts and what is sent."""
    return {
        "id": one.id,
        "outlet": one.outlet,
        "shift": one.shift_id,
        "state": one.state,
        "created": one.created_utc,
        "due": one.due_utc,
        "attempts": [attempt_json(attempt) for attempt in attempts],
        "body": _body(one.body),
    }


def attempt_cells(one: Attempt) -> list[Cell]:
    """A line of `deliveries ID`."""
    return [one.at_utc, one.outcome, one.status, one.took_seconds, one.error]


def attempt_json(one: Attempt) -> dict[str, object]:
    """One attempt."""
    return {
        "at": one.at_utc,
        "outcome": one.outcome,
        "status": one.status,
        "error": one.error,
        "took_seconds": one.took_seconds,
    }


def _body(body: bytes) -> object:
    """As JSON where it is JSON, as webhooks are."""
    try:
        return json.loads(body)
    except ValueError:
        return body.decode("utf-8", "replace")
