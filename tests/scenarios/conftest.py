"""The whole path on loopback: an invented house's counting service, its desk, and a clock set by hand.

Every show and number here is made up.
"""

import base64
import datetime
import hashlib
import hmac
import json
import random
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.model import Model
from service.deliver.loop import deliver_due
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from service.round.calendar import Axis, Interval
from service.round.once import RoundOutcome
from service.round.plans import CalendarShape, ReleaseShape, RoundPlan, StreamPlan
from service.sources.plans import Bounds, FieldPlan, JsonPlan, WebPlace
from service.tell.tell import Taker
from service.work import Bench, pass_for
from storage import migrate
from storage.engine import Store, open_store
from storage.posteriors import StoredPosterior, history
from storage.rounds import Round, get_round
from storage.shifts import Shift, list_shifts

UTC = ZoneInfo("UTC")
MONDAY = datetime.date(2025, 1, 6)
SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"  # the key of the specification's test vector
WEEK = datetime.timedelta(weeks=1)

# Stated here rather than left to the defaults, so that what is announced where stays as it is.
WEEKS = CalendarShape(Axis(Interval("week"), UTC), "missing")
RULE = Rule(threshold=0.9, window=40, lasting=4, fewest_counts=12)
MODEL = Model(
    gap=GapPrior(shape=2, mean=150.0),
    one_off_share=0.02,
    dispersions=(4.0, 8.0, 16.0, 32.0, 64.0),
    wanders=((0.01, 1.0),),
)
PLAYS = FieldPlan("$.day", "$.plays", split="$.show")


def levels(seed: int, *spans: tuple[float, int]) -> list[int]:
    """Negative binomial counts of dispersion 30 around these levels, so many of each."""
    rng = np.random.default_rng(seed)
    return [int(rng.negative_binomial(30, 30 / (30 + mean))) for mean, number in spans for _ in range(number)]


@dataclass
class HandClock:
    """The time of day is set by hand; deadlines are measured on the machine's steady clock."""

    instant: datetime.datetime

    def now(self) -> datetime.datetime:
        return self.instant

    def monotonic(self) -> float:
        return time.monotonic()

    def real_seconds(self, duration: datetime.timedelta) -> float:
        return duration.total_seconds()


@dataclass
class Studio:
    """The counting service. Serves rows as JSON with an ETag; a test may break it.

    A walker in another process says in a header which instant it has; it is served the weeks over by then.
    """

    address: str = ""
    rows: list[dict[str, object]] = field(default_factory=list)
    broken: tuple[int, bytes] | None = None
    drip_seconds: float = 0.0
    asked: list[int] = field(default_factory=list)
    instants: list[str] = field(default_factory=list)
    by_show: dict[str, list[int]] = field(default_factory=dict)
    now: Callable[[], str] | None = None
    reached: threading.Event = field(default_factory=threading.Event)

    def weekly(self, show: str, counts: list[int | None], first: datetime.date = MONDAY) -> None:
        """Replaces a show's rows."""
        self.rows = [row for row in self.rows if row["show"] != show] + [
            {"show": show, "day": (first + number * WEEK).isoformat(), "plays": count}
            for number, count in enumerate(counts)
        ]

    def serve_by_instant(self, by_show: dict[str, list[int]]) -> None:
        self.by_show = by_show

    def rows_by(self, instant: str) -> list[dict[str, object]]:
        day = datetime.datetime.fromisoformat(instant).date()
        return [
            {"show": show, "day": (MONDAY + number * WEEK).isoformat(), "plays": count}
            for show, counts in self.by_show.items()
            for number, count in enumerate(counts)
            if MONDAY + (number + 1) * WEEK <= day
        ]

    def answer(self, tag: str | None) -> tuple[int, bytes, str]:
        if self.broken is not None:
            return (*self.broken, "")
        body = json.dumps({"data": self.rows}).encode()
        current = '"' + hashlib.sha256(body).hexdigest()[:12] + '"'
        return (304, b"", current) if tag == current else (200, body, current)


@dataclass
class Desk:
    """The receiver: verifies each signature by hand, and keeps what came. `refuse` answers 503 so often."""

    address: str = ""
    came: list[tuple[str, dict[str, object]]] = field(default_factory=list)
    refuse: int = 0
    forged: int = 0
    arrived: threading.Event = field(default_factory=threading.Event)

    def take(self, headers: dict[str, str], body: bytes) -> int:
        signed = f"{headers['webhook-id']}.{headers['webhook-timestamp']}.".encode() + body
        key = base64.b64decode(SECRET.removeprefix("whsec_"))
        expected = "v1," + base64.b64encode(hmac.digest(key, signed, "sha256")).decode()
        if headers["webhook-signature"] != expected:
            self.forged += 1
            return 400
        if self.refuse:
            self.refuse -= 1
            return 503
        self.came.append((headers["webhook-id"], json.loads(body)))
        self.arrived.set()
        return 200


@pytest.fixture
def loopback() -> Iterator[Callable[[object], str]]:
    """Starts a server around a studio or a desk; gives its address."""
    running: list[tuple[ThreadingHTTPServer, threading.Thread]] = []

    def start(inner: object) -> str:
        server = ThreadingHTTPServer(("127.0.0.1", 0), _handler(inner))
        thread = threading.Thread(target=server.serve_forever, args=(0.02,))
        thread.start()
        running.append((server, thread))
        return f"http://127.0.0.1:{server.server_address[1]}/house"

    yield start
    for server, thread in running:
        server.shutdown()
        thread.join(5)
        server.server_close()


def _handler(inner: object) -> type[BaseHTTPRequestHandler]:
    class Handler(BaseHTTPRequestHandler):
        def do_GET(self) -> None:
            assert isinstance(inner, Studio)
            inner.reached.set()
            instant = self.headers.get("x-instant") or (inner.now and inner.now())
            if instant is not None:
                inner.instants.append(instant)
                inner.rows = inner.rows_by(instant)
            status, body, tag = inner.answer(self.headers.get("if-none-match"))
            inner.asked.append(status)
            self.send_response(status)
            if tag:
                self.send_header("etag", tag)
            self.send_header("content-length", str(len(body)))
            self.end_headers()
            try:
                self._drip(body, inner.drip_seconds)
            except OSError:  # The reader has had enough.
                return

        def _drip(self, body: bytes, seconds: float) -> None:
            for byte in body if seconds else ():
                self.wfile.write(bytes([byte]))
                time.sleep(seconds)
            if not seconds:
                self.wfile.write(body)

        def do_POST(self) -> None:
            assert isinstance(inner, Desk)
            body = self.rfile.read(int(self.headers["content-length"]))
            status = inner.take({name.lower(): value for name, value in self.headers.items()}, body)
            self.send_response(status)
            self.send_header("content-length", "0")
            self.end_headers()

        def log_message(self, format: str, *args: object) -> None:
            pass

    return Handler


@dataclass(frozen=True)
class Settings:
    """What a settings file would say."""

    shape: CalendarShape | ReleaseShape = WEEKS
    rule: Rule = RULE
    model: Model = MODEL
    left_out: frozenset[str] = frozenset()
    every: datetime.timedelta = WEEK
    deadline_seconds: float = 10.0
    fields: FieldPlan = PLAYS


def round_plan(settings: Settings, address: str, name: str = "plays") -> RoundPlan:
    """The plan of one source."""
    source = JsonPlan(
        name,
        WebPlace(address),
        "$.data[*]",
        settings.fields,
        UTC,
        bounds=Bounds(deadline_seconds=settings.deadline_seconds),
    )
    mark = hashlib.sha256(f"{settings.shape} {settings.rule} {settings.model}".encode()).hexdigest()[:12]

    def stream_for(split: str | None) -> StreamPlan | None:
        if split is None or split in settings.left_out:
            return None
        title, slate = split.title(), "house"
        return StreamPlan(
            f"{name}/{split}",
            name,
            split,
            title,
            slate,
            settings.shape,
            settings.model,
            settings.rule,
            mark,
        )

    return RoundPlan(
        name, source, settings.every, stream_for, sorting=f"{settings.shape} {settings.left_out}"
    )


@dataclass
class World:
    """One store, one source, one outlet, and the hand that moves them."""

    store: Store
    clock: HandClock
    studio: Studio
    desk: Desk
    settings: Settings = Settings()
    stop: threading.Event = field(default_factory=threading.Event)

    def plan(self, name: str = "plays") -> RoundPlan:
        return round_plan(self.settings, self.studio.address, name)

    def bench(self, store: Store | None = None) -> Bench:
        return Bench(store or self.store, self.clock, (Taker("desk"),), self.stop)

    def outlet(self) -> Webhook:
        return Webhook("desk", self.desk.address, Signer(SECRET), time.monotonic)

    def change(self, **changes: object) -> None:
        self.settings = replace(self.settings, **changes)  # type: ignore[arg-type]

    def read(self) -> RoundOutcome:
        """Round, backlog, tell."""
        return pass_for(self.bench(), self.plan()).round

    def poll(self) -> Round:
        """All of the path, at the present instant."""
        outcome = self.read()
        self.deliver()
        with self.store.reading() as conn:
            return get_round(conn, outcome.round_id)

    def deliver(self) -> None:
        deliver_due(self.store, [self.outlet()], self.clock, random.Random(1).random)

    def at_week(self, number: int, hours: int = 6) -> None:
        """Sets the clock to some hours after week `number` (from 0 on) is over."""
        over = MONDAY + (number + 1) * WEEK
        self.clock.instant = datetime.datetime(
            over.year, over.month, over.day, tzinfo=UTC
        ) + datetime.timedelta(hours=hours)

    def live(self, show: str, counts: list[int], first: int) -> None:
        """Lets the counts from place `first` on arrive week by week."""
        for number in range(first, len(counts)):
            self.at_week(number)
            self.studio.weekly(show, counts[: number + 1])
            self.poll()

    def shifts(self, stream: str = "plays/quay") -> tuple[Shift, ...]:
        with self.store.reading() as conn:
            return list_shifts(conn, stream_id=stream)

    def history(self, stream: str = "plays/quay", store: Store | None = None) -> tuple[StoredPosterior, ...]:
        with (store or self.store).reading() as conn:
            return history(conn, stream)

    def said(self, stream: str = "plays/quay", store: Store | None = None) -> list[StoredPosterior]:
        """What was said of a stream, without ids and times of writing."""
        fixed = datetime.datetime(2000, 1, 1, tzinfo=UTC)
        return [replace(row, id=0, reading_id=None, written_utc=fixed) for row in self.history(stream, store)]


@pytest.fixture(scope="session")
def migrated_bytes(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    path = tmp_path_factory.mktemp("migrated") / "store.sqlite"
    with open_store(str(path)) as store:
        migrate.upgrade(store)
    return path.read_bytes()


@pytest.fixture
def open_fresh(tmp_path: Path, migrated_bytes: bytes) -> Iterator[Callable[[str], Store]]:
    """Opens stores in files of their own; a name that is there already is opened a second time."""
    opened: list[Store] = []

    def open_one(name: str) -> Store:
        path = tmp_path / f"{name}.sqlite"
        if not path.exists():
            path.write_bytes(migrated_bytes)
        opened.append(open_store(str(path), wait_seconds=20.0))
        return opened[-1]

    yield open_one
    for store in opened:
        store.close()


@pytest.fixture
def studio(loopback: Callable[[object], str]) -> Studio:
    one = Studio()
    one.address = loopback(one)
    return one


@pytest.fixture
def desk(loopback: Callable[[object], str]) -> Desk:
    one = Desk()
    one.address = loopback(one)
    return one


@pytest.fixture
def world(open_fresh: Callable[[str], Store], studio: Studio, desk: Desk) -> World:
    clock = HandClock(datetime.datetime(2026, 1, 5, 6, tzinfo=UTC))
    return World(open_fresh("store"), clock, studio, desk)


@pytest.fixture
def secret() -> str:
    return SECRET


@pytest.fixture
def counts_of() -> Callable[..., list[int]]:
    return levels
