"""Delivering in the daemon: one thread an outlet, so that a slow outlet delays no other."""

import threading
from collections.abc import Callable, Sequence

from service.deliver.log_lines import log_trouble
from service.deliver.loop import Tools, count_strays, deliver_outlet
from service.outlets.outlet import Outlet
from storage.outbox import next_due

LONGEST_NAP_SECONDS = 5.0
SHORTEST_NAP_SECONDS = 0.05

Trouble = Callable[[str, Exception], None]


class Deliverer:
    """Threads that deliver until they are stopped.

    A worker sleeps until its next delivery is due, until `wake`, or for `LONGEST_NAP_SECONDS`, so that it
    also finds what another process puts into the outbox. `trouble` hears the outlet's name and the error when
    an attempt could not be taken up or recorded; the worker takes a nap and goes on.
    """

    def __init__(self, tools: Tools, outlets: Sequence[Outlet], trouble: Trouble = log_trouble) -> None:
        self._tools, self._trouble = tools, trouble
        self._names = [outlet.name for outlet in outlets]
        self._stop = threading.Event()
        self._bells = [threading.Event() for _ in outlets]
        self._threads = [
            threading.Thread(target=self._work, args=pair, name=f"deliver {pair[0].name}", daemon=True)
            for pair in zip(outlets, self._bells, strict=True)
        ]

    def start(self) -> None:
        """Start the workers; a log line says what waits for outlets that are not among theirs."""
        count_strays(self._tools.store, self._names)
        for thread in self._threads:
            thread.start()

    def wake(self) -> None:
        """Something has been put into the outbox."""
        for bell in self._bells:
            bell.set()

    def stop(self, within_seconds: float) -> bool:
        """Begin no further attempt and wait for those under way; whether all ended within the bound.

        An attempt that did not is repeated after the next start, under its id.
        """
        self._stop.set()
        self.wake()
        ends = self._tools.clock.monotonic() + within_seconds
        for thread in self._threads:
            thread.join(max(0.0, ends - self._tools.clock.monotonic()))
        return not any(thread.is_alive() for thread in self._threads)

    def _work(self, outlet: Outlet, bell: threading.Event) -> None:
        while not self._stop.is_set():
            bell.wait(self._pass(outlet))
            # Only now: whatever rang during the pass cuts the nap short.
            bell.clear()

    def _pass(self, outlet: Outlet) -> float:
        """One pass; gives how long to sleep after it."""
        try:
            deliver_outlet(self._tools, outlet, self._stop)
            return self._nap_seconds(outlet)
        except Exception as error:  # A worker that died would leave its outlet silent.
            self._trouble(outlet.name, error)
            return LONGEST_NAP_SECONDS

    def _nap_seconds(self, outlet: Outlet) -> float:
        with self._tools.store.reading() as conn:
            due = next_due(conn, outlet=outlet.name)
        if due is None:
            return LONGEST_NAP_SECONDS
        left = (due - self._tools.clock.now()).total_seconds()
        return min(max(left, SHORTEST_NAP_SECONDS), LONGEST_NAP_SECONDS)
