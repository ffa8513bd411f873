"""Calls the address that notices when good rounds stop coming, so that a dead daemon is noticed."""

from collections.abc import Callable

from service.calls import Fetch, FetchError
from service.http_client import fetch
from service.logs import log

DEADLINE_SECONDS = 10.0
LARGEST_ANSWER = 65_536


def report_good_round(address: str, source: str, monotonic: Callable[[], float]) -> None:
    """One GET; that it failed is logged and changes nothing. The address is a secret."""
    request = Fetch(address, "the good-rounds address")
    try:
        answer = fetch(
            request, deadline_seconds=DEADLINE_SECONDS, largest_body=LARGEST_ANSWER, monotonic=monotonic
        )
    except FetchError as error:
        log.warning("good round not reported", source=source, why=str(error))
        return
    if not 200 <= answer.status < 300:
        log.warning("good round not reported", source=source, status=answer.status)
