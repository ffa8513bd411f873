"""What an answer means: RFC 9110 for the statuses, Standard Webhooks 1.0.0 for 2xx, 3xx and 410."""

import pytest

from service.outlets.answers import kind_of, outcome_of
from service.outlets.outlet import Kind


@pytest.mark.parametrize("status", [200, 201, 202, 204, 299])
def test_only_2xx_is_success(status: int, clock):
    outcome = outcome_of("It", status, {}, clock.now())
    assert (outcome.kind, outcome.status, outcome.error) == (Kind.DELIVERED, status, None)


@pytest.mark.parametrize("status", [100, 408, 425, 429, 500, 502, 503, 504, 599, 600, 999])
def test_these_ask_for_another_time(status: int):
    assert kind_of(status) is Kind.TRY_LATER


@pytest.mark.parametrize("status", [300, 301, 302, 304, 307, 308, 400, 401, 403, 404, 405, 413, 422, 451])
def test_these_must_be_mended_by_people(status: int):
    assert kind_of(status) is Kind.REFUSED


def test_410_ends_it_whatever_else_it_says(clock):
    outcome = outcome_of("It", 410, {"retry-after": "5"}, clock.now())
    assert outcome.kind is Kind.ENDED
    assert outcome.retry_after_seconds is None
    assert outcome.error == "It answered 410: it is gone for good, by its own word."


def test_retry_after_is_passed_on(clock):
    assert outcome_of("It", 429, {"retry-after": "7"}, clock.now()).retry_after_seconds == 7.0
    assert outcome_of("It", 503, {}, clock.now()).retry_after_seconds is None


def test_a_redirect_is_explained_without_its_address(clock):
    outcome = outcome_of("It", 301, {"location": "https://elsewhere.example/token"}, clock.now())
    assert "redirects are not followed" in outcome.error
    assert "elsewhere" not in outcome.error
