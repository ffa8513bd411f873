"""Deliveries as people read them."""

from collections.abc import Sequence

from service.cli.show import say, show_table
from service.cli.work_view import (
    ATTEMPT_COLUMNS,
    DELIVERY_COLUMNS,
    attempt_cells,
    delivery_cells,
    delivery_sentence,
)
from storage.outbox import Attempt, Delivery


def show_deliveries(deliveries: Sequence[Delivery]) -> None:
    """A table, and what is to be known of those that have not arrived."""
    show_table(DELIVERY_COLUMNS, [delivery_cells(one) for one in deliveries])
    for one in deliveries:
        sentence = delivery_sentence(one)
        if sentence is not None:
            say(sentence)


def show_delivery(delivery: Delivery, attempts: Sequence[Attempt]) -> None:
    """One delivery with each attempt at it."""
    show_deliveries([delivery])
    if attempts:
        say("")
        show_table(ATTEMPT_COLUMNS, [attempt_cells(one) for one in attempts])
