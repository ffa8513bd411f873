"""The HTTP client against a server of raw sockets on loopback that misbehaves on purpose."""

import contextlib
import gzip
import socket
import threading
import time
import traceback
from collections.abc import Callable, Iterator

import pytest

from service.calls import BodyTooLarge, Deadline, Fetch, FetchError, FetchFailed, FetchTimedOut, Post
from service.http_client import MOST_REDIRECTS, Session, fetch, host_of, join, post, same_origin

Talk = Callable[[socket.socket, int], None]
SECRET = "s3cret-token-9871"


class Server:
    """Talks to each connection by a function of the connection and its number."""

    def __init__(self, talk: Talk) -> None:
        self.talk, self.heads, self.stopped = talk, [], threading.Event()
        self.socket = socket.create_server(("127.0.0.1", 0))
        self.socket.settimeout(0.05)
        self.port = self.socket.getsockname()[1]
        self.address = f"http://127.0.0.1:{self.port}/counts"
        self.threads: list[threading.Thread] = []
        self.start(self._accept)

    def start(self, work: Callable[[], None]) -> None:
        thread = threading.Thread(target=work)
        self.threads.append(thread)
        thread.start()

    def _accept(self) -> None:
        number = 0
        while not self.stopped.is_set():
            try:
                connection, _ = self.socket.accept()
            except TimeoutError:
                continue
            number += 1
            self.start(lambda c=connection, n=number: self._talk(c, n))

    def _talk(self, connection: socket.socket, number: int) -> None:
        connection.settimeout(5)
        with connection, contextlib.suppress(OSError):
            self.talk(connection, number)

    def read_head(self, connection: socket.socket) -> str:
        data = b""
        while b"\r\n\r\n" not in data:
            piece = connection.recv(4096)
            if not piece:
                return ""
            data += piece
        self.heads.append(data.decode("latin-1"))
        return self.heads[-1]

    def drip(self, connection: socket.socket, data: bytes) -> None:
        for byte in data:
            if self.stopped.wait(0.02):
                return
            connection.sendall(bytes([byte]))

    def stop(self) -> None:
        self.stopped.set()
        for thread in self.threads:
            thread.join(5)
        self.socket.close()


@pytest.fixture
def serve() -> Iterator[Callable[[Talk], Server]]:
    servers: list[Server] = []

    def start(talk: Talk) -> Server:
        servers.append(Server(talk))
        return servers[-1]

    yield start
    for server in servers:
        server.stop()


def answer(body: bytes, status: str = "200 OK", *headers: str) -> bytes:
    lines = [f"HTTP/1.1 {status}", f"Content-Length: {len(body)}", *headers, "", ""]
    return "\r\n".join(lines).encode("latin-1") + body


def answering(data: bytes) -> Callable[[Callable[[Talk], Server]], Server]:
    def start(serve: Callable[[Talk], Server]) -> Server:
        def talk(connection: socket.socket, _: int) -> None:
            server.read_head(connection)
            connection.sendall(data)

        server = serve(talk)
        return server

    return start


def get(address: str, seconds: float = 5.0, largest: int = 100_000, **fields: object) -> object:
    request = Fetch(address, **fields)  # type: ignore[arg-type]
    return fetch(request, deadline_seconds=seconds, largest_body=largest, monotonic=time.monotonic)


def test_a_whole_answer_with_its_headers(serve):
    server = answering(answer(b"[1]", "200 OK", 'ETag: "a"', "Link: <b>; rel=x", "Link: <c>; rel=y"))(serve)
    got = get(server.address)
    assert (got.status, got.body, got.headers["etag"]) == (200, b"[1]", '"a"')
    assert got.headers["link"] == "<b>; rel=x, <c>; rel=y"


@pytest.mark.parametrize("slow_from", [0, 45], ids=["headers", "body"])
def test_a_dripping_server_meets_the_total_deadline(serve, slow_from):
    """Each read gets its byte in time, so that a limit for one read would never end this."""

    def talk(connection: socket.socket, _: int) -> None:
        server.read_head(connection)
        data = answer(b"x" * 2000, "200 OK", "Content-Type: text/plain")
        connection.sendall(data[:slow_from])
        server.drip(connection, data[slow_from:])

    server = serve(talk)
    started = time.monotonic()
    with pytest.raises(FetchTimedOut, match=r"did not answer in full within 0\.3 s"):
        get(server.address, seconds=0.3)
    assert 0.25 < time.monotonic() - started < 1.0


def test_a_server_that_never_answers(serve):
    server = serve(lambda connection, _: server.read_head(connection) and server.stopped.wait(3))
    with pytest.raises(FetchTimedOut):
        get(server.address, seconds=0.1)


def test_the_deadline_is_on_the_clock_that_was_passed_in(serve):
    server = answering(answer(b"[]"))(serve)
    ticks = iter([0.0, 11.0, 11.0, 11.0])
    with pytest.raises(FetchTimedOut, match="10 s"):
        fetch(Fetch(server.address), deadline_seconds=10, largest_body=10, monotonic=lambda: next(ticks))


def test_a_body_too_large_by_its_length_or_by_its_bytes(serve):
    announced = answering(answer(b"x" * 2000))(serve)
    with pytest.raises(BodyTooLarge, match="more than the 1000 bytes"):
        get(announced.address, largest=1000)
    unannounced = answering(b"HTTP/1.1 200 OK\r\n\r\n" + b"x" * 2000)(serve)
    with pytest.raises(BodyTooLarge):
        get(unannounced.address, largest=1000)
    packed = answering(answer(gzip.compress(b"x" * 2000), "200 OK", "Content-Encoding: gzip"))(serve)
    with pytest.raises(BodyTooLarge):
        get(packed.address, largest=1000)
    assert get(packed.address, largest=2000).body == b"x" * 2000


def test_a_packing_that_cannot_be_bounded_is_refused(serve):
    server = answering(answer(b"abc", "200 OK", "Content-Encoding: br"))(serve)
    with pytest.raises(FetchFailed, match="not asked for"):
        get(server.address)


def test_damaged_packing(serve):
    server = answering(answer(b"abc", "200 OK", "Content-Encoding: gzip"))(serve)
    with pytest.raises(FetchFailed, match="cannot be unpacked"):
        get(server.address)


@pytest.mark.parametrize("data", [b"", b"HTTP/1.1 200 OK\r\nContent-Length: 9\r\n\r\nabc", b"hello\r\n\r\n"])
def test_a_connection_that_ends_early_is_a_failure_and_not_a_short_body(serve, data):
    server = answering(data)(serve)
    with pytest.raises(FetchFailed, match="ended before"):
        get(server.address)
    assert len(server.heads) == 1, "a new connection that fails is not tried again"


def test_a_kept_connection_that_was_closed_is_replaced_once(serve):
    def talk(connection: socket.socket, _: int) -> None:
        server.read_head(connection)
        connection.sendall(answer(b"[]"))
        # Takes the next request and hangs up, as a server does whose patience just ran out.
        server.read_head(connection)

    server = serve(talk)
    with Session(Deadline.after(5, time.monotonic)) as session:
        bodies = [session.fetch(Fetch(server.address), largest_body=10).body for _ in range(2)]
    assert bodies == [b"[]", b"[]"]
    assert len(server.heads) == 3


def test_pages_share_one_connection(serve):
    seen: list[int] = []

    def talk(connection: socket.socket, number: int) -> None:
        while server.read_head(connection):
            seen.append(number)
            connection.sendall(answer(b"[]"))

    server = serve(talk)
    with Session(Deadline.after(5, time.monotonic)) as session:
        for _ in range(3):
            session.fetch(Fetch(server.address), largest_body=10)
    assert seen == [1, 1, 1]


def test_redirects_keep_secret_headers_on_their_origin_only(serve):
    other = answering(answer(b"there"))(serve)
    near = answering(answer(b"", "302 Found", f"Location: {other.address}"))(serve)
    got = get(near.address, headers=(("X-Key", SECRET),), open_headers=(("Accept", "text/csv"),))
    assert got.body == b"there"
    assert SECRET in near.heads[0]
    assert SECRET not in other.heads[0]
    assert "text/csv" in other.heads[0]


def test_a_redirect_on_the_same_origin_keeps_headers_and_resolves_a_relative_location(serve):
    def talk(connection: socket.socket, _: int) -> None:
        while head := server.read_head(connection):
            there = head.startswith("GET /there ")
            connection.sendall(answer(b"ok") if there else answer(b"", "307 Again", "Location: there"))

    server = serve(talk)
    got = get(server.address, headers=(("X-Key", SECRET),))
    assert (got.body, got.address) == (b"ok", server.address.replace("counts", "there"))
    assert all(SECRET in head for head in server.heads)


def test_redirects_end(serve):
    def talk(connection: socket.socket, _: int) -> None:
        while server.read_head(connection):
            connection.sendall(answer(b"", "302 Found", "Location: /counts"))

    server = serve(talk)
    with pytest.raises(FetchFailed, match=f"more than {MOST_REDIRECTS} times"):
        get(server.address)
    assert len(server.heads) == MOST_REDIRECTS + 1


def test_a_redirect_to_another_kind_of_address_is_refused(serve):
    server = answering(answer(b"", "302 Found", "Location: file:///etc/hostname"))(serve)
    with pytest.raises(FetchFailed, match="no http or https address"):
        get(server.address)


def test_a_post_goes_out_as_it_is_and_follows_no_redirect(serve):
    bodies: list[str] = []

    def talk(connection: socket.socket, _: int) -> None:
        body = server.read_head(connection).partition("\r\n\r\n")[2]
        bodies.append(body or connection.recv(100).decode())
        connection.sendall(answer(b"", "307 Go", "Location: /elsewhere", "Retry-After: 120"))

    server = serve(talk)
    request = Post(server.address, b'{"a": 1}', headers=(("Content-Type", "application/json"),))
    got = post(request, deadline_seconds=5, monotonic=time.monotonic)
    assert (got.status, got.headers["retry-after"]) == (307, "120")
    assert len(server.heads) == 1
    assert "content-type: application/json" in server.heads[0].lower()
    assert bodies == ['{"a": 1}']


def test_a_post_counts_as_arrived_when_only_the_answers_body_hangs(serve):
    def talk(connection: socket.socket, _: int) -> None:
        server.read_head(connection)
        connection.sendall(b"HTTP/1.1 202 Accepted\r\nContent-Length: 100\r\n\r\nthanks")
        server.stopped.wait(2)

    server = serve(talk)
    got = post(Post(server.address, b"{}"), deadline_seconds=0.2, monotonic=time.monotonic)
    assert (got.status, got.body) == (202, b"thanks")


def test_a_post_to_a_connection_that_ends_is_not_tried_again(serve):
    server = answering(b"")(serve)
    with pytest.raises(FetchFailed):
        post(Post(server.address, b"{}"), deadline_seconds=5, monotonic=time.monotonic)
    assert len(server.heads) == 1


def test_proxies_and_logins_of_the_environment_are_not_used(serve, monkeypatch, tmp_path):
    (tmp_path / "netrc").write_text("machine 127.0.0.1 login somebody password something\n")
    monkeypatch.setenv("NETRC", str(tmp_path / "netrc"))
    monkeypatch.setenv("HTTP_PROXY", "http://127.0.0.1:9")
    server = answering(answer(b"[]"))(serve)
    assert get(server.address).body == b"[]"
    assert "authorization" not in server.heads[0].lower()


def _refused_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as closed:
        return closed.getsockname()[1]


@pytest.mark.parametrize(
    ("address", "headers", "why"),
    [
        (f"http://127.0.0.1:{{port}}/{SECRET}", (), "it refuses the connection"),
        (f"http://{SECRET}{'a' * 64}.test/", (), "the name of its host is not known"),
        (f"ftp://{SECRET}/", (), "no http or https address"),
        (f"http://[{SECRET}/", (), "no http or https address"),
        (f"{SECRET}", (), "no http or https address"),
        ("http://127.0.0.1:1/", (("X-Key", f"{SECRET}é"),), 'value of header "X-Key"'),
        ("http://127.0.0.1:1/", (("X-Key", f"{SECRET}\nB: c"),), 'value of header "X-Key"'),
        ("http://127.0.0.1:1/", ((f"X {SECRET}", "a"),), "a header's name"),
    ],
)
def test_no_error_holds_a_secret_even_in_its_chain(address, headers, why):
    with pytest.raises(FetchError) as caught:
        get(address.replace("{port}", str(_refused_port())), headers=headers)
    shown = "".join(traceback.format_exception(caught.value)) + repr(caught.value)
    assert why in str(caught.value)
    assert SECRET not in shown.replace(repr(address), "")
    assert caught.value.__context__ is None


def test_requests_do_not_print_their_secrets():
    request = Fetch(f"https://x.test/{SECRET}", headers=(("X-Key", SECRET),))
    sent = Post(f"https://x.test/{SECRET}", SECRET.encode(), headers=(("X-Key", SECRET),))
    assert SECRET not in repr(request) + repr(sent)


def test_what_is_named_is_the_callers_choice():
    address = f"http://127.0.0.1:{_refused_port()}/"
    with pytest.raises(FetchFailed, match=r"^127\.0\.0\.1 could not be called"):
        get(address, named=host_of(address))


@pytest.mark.parametrize(
    ("one", "other", "same"),
    [
        ("http://a.test/x", "http://a.test:80/y", True),
        ("http://a.test/x", "https://a.test/y", True),
        ("https://a.test/x", "http://a.test/y", False),
        ("http://a.test:8080/x", "https://a.test/y", False),
        ("http://a.test/x", "http://b.test/x", False),
        ("https://a.test/x", "https://a.test:8443/x", False),
    ],
)
def test_origins(one, other, same):
    assert same_origin(one, other) is same


# RFC 3986 section 5.4, normal examples, from memory; recomputed with urllib.parse.urljoin.
@pytest.mark.parametrize(
    ("reference", "expected"),
    [
        ("g", "http://a/b/c/g"),
        ("/g", "http://a/g"),
        ("?y", "http://a/b/c/d;p?y"),
        ("//g", "http://g"),
        ("../g", "http://a/b/g"),
        ("g?y#s", "http://a/b/c/g?y"),
    ],
)
def test_references_are_resolved(reference, expected):
    assert join("http://a/b/c/d;p?q", reference).rstrip("/") == expected


@pytest.mark.parametrize("reference", ["javascript:1", "mailto:a@b", "http://[", "http://a:99999999/"])
def test_other_references_are_refused(reference):
    with pytest.raises(ValueError, match="no http or https"):
        join("http://a/b", reference)
