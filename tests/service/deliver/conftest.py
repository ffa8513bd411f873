"""Outlets that do as they are told, messages in the outbox, and what a pass needs."""

from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime

import pytest

from service.deliver.attempt import Report
from service.deliver.loop import Tools
from service.outlets.outlet import Kind, Outcome
from storage.engine import Store
from storage.outbox import NewDelivery, add_delivery


@dataclass
class Told:
    """An outlet whose outcomes a test writes down; an exception among them is raised."""

    name: str
    outcomes: list[Outcome | Exception] = field(default_factory=list)
    sent: list[tuple[str, bytes, datetime]] = field(default_factory=list)
    before: Callable[[], object] = lambda: None
    attempt_seconds: float = 5.0

    def send(self, delivery_id: str, body: bytes, now: datetime) -> Outcome:
        self.before()
        self.sent.append((delivery_id, body, now))
        outcome = self.outcomes.pop(0) if self.outcomes else Outcome(Kind.DELIVERED, 200)
        if isinstance(outcome, Exception):
            raise outcome
        return outcome


@pytest.fixture
def told() -> type[Told]:
    return Told


@pytest.fixture
def reports() -> list[Report]:
    return []


@pytest.fixture
def tools(store: Store, clock, reports: list[Report]) -> Tools:
    return Tools(store, clock, lambda: 0.0, reports.append)


@pytest.fixture
def put(store: Store, clock) -> Callable[..., None]:
    def put_in(delivery_id: str, outlet: str = "desk", body: bytes = b'{"a":1}') -> None:
        now = clock.now()
        with store.writing() as conn:
            assert add_delivery(conn, NewDelivery(delivery_id, outlet, None, body, now, now))

    return put_in
