"""A clock that is set by hand, a fresh store, and a receiver on loopback that answers as it is told."""

import threading
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path

import pytest

from storage import migrate
from storage.engine import Store, open_store

START = datetime(2026, 3, 16, 9, 0, tzinfo=UTC)


@dataclass
class SetClock:
    """Stands still until it is moved on."""

    instant: datetime = START
    seconds: float = 0.0

    def now(self) -> datetime:
        return self.instant

    def monotonic(self) -> float:
        return self.seconds

    def move_on(self, step: timedelta) -> None:
        self.instant += step
        self.seconds += step.total_seconds()


@pytest.fixture
def clock() -> SetClock:
    return SetClock()


@pytest.fixture(scope="session")
def migrated_bytes(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    path = tmp_path_factory.mktemp("migrated") / "store.sqlite"
    with open_store(str(path)) as store:
        migrate.upgrade(store)
    return path.read_bytes()


@pytest.fixture
def store(tmp_path: Path, migrated_bytes: bytes) -> Iterator[Store]:
    path = tmp_path / "store.sqlite"
    path.write_bytes(migrated_bytes)
    with open_store(str(path), wait_seconds=5.0) as opened:
        yield opened


@dataclass(frozen=True)
class Answer:
    """How the receiver treats one POST. `hang` keeps it waiting to the end of the test, `drop` hangs up."""

    status: int = 200
    headers: tuple[tuple[str, str], ...] = ()
    hang: bool = False
    drop: bool = False


@dataclass(frozen=True)
class Received:
    """One POST as it came."""

    path: str
    headers: dict[str, str]
    body: bytes


@dataclass
class Receiver:
    """Answers in the order of `answers`, and 200 when they are used up. `came` is set by the first POST."""

    address: str
    answers: list[Answer] = field(default_factory=list)
    received: list[Received] = field(default_factory=list)
    came: threading.Event = field(default_factory=threading.Event)
    over: threading.Event = field(default_factory=threading.Event)
    lock: threading.Lock = field(default_factory=threading.Lock)

    def will(self, *answers: Answer) -> None:
        self.answers.extend(answers)

    def take(self, received: Received) -> Answer:
        with self.lock:
            self.received.append(received)
            self.came.set()
            return self.answers.pop(0) if self.answers else Answer()


@pytest.fixture
def answer() -> type[Answer]:
    return Answer


@pytest.fixture
def open_receiver() -> Iterator[Callable[[], Receiver]]:
    running: list[tuple[Receiver, ThreadingHTTPServer, threading.Thread]] = []

    def start() -> Receiver:
        server = ThreadingHTTPServer(("127.0.0.1", 0), _handler(lambda: receiver))
        server.daemon_threads = False
        receiver = Receiver(f"http://127.0.0.1:{server.server_address[1]}/alerts")
        thread = threading.Thread(target=server.serve_forever, args=(0.02,))
        thread.start()
        running.append((receiver, server, thread))
        return receiver

    yield start
    for receiver, server, thread in running:
        receiver.over.set()
        server.shutdown()
        thread.join(5)
        server.server_close()


@pytest.fixture
def receiver(open_receiver: Callable[[], Receiver]) -> Receiver:
    return open_receiver()


def _handler(receiver_of: Callable[[], Receiver]) -> type[BaseHTTPRequestHandler]:
    class Handler(BaseHTTPRequestHandler):
        protocol_version = "HTTP/1.1"

        def do_POST(self) -> None:
            receiver = receiver_of()
            body = self.rfile.read(int(self.headers["content-length"]))
            headers = {name.lower(): value for name, value in self.headers.items()}
            answer = receiver.take(Received(self.path, headers, body))
            self.close_connection = True
            if answer.hang:
                receiver.over.wait(10)
            if answer.hang or answer.drop:
                return
            self.send_response(answer.status)
            for name, value in (*answer.headers, ("content-length", "0"), ("connection", "close")):
                self.send_header(name, value)
            self.end_headers()

        def do_GET(self) -> None:
            receiver_of().take(Received("GET " + self.path, {}, b""))
            self.send_response(200)
            self.send_header("content-length", "0")
            self.end_headers()

        def log_message(self, format: str, *args: object) -> None:
            pass

    return Handler
