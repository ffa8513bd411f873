"""A server of loopback whose answers a test writes down by path."""

import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer

import pytest

from service.sources.open_source import Tools


@dataclass
class Reply:
    body: bytes = b""
    status: int = 200
    headers: tuple[tuple[str, str], ...] = ()


@dataclass
class House:
    """What is served, and what was asked: (path, headers by name in lower case)."""

    address: str
    replies: dict[str, Reply] = field(default_factory=dict)
    asked: list[tuple[str, dict[str, str]]] = field(default_factory=list)

    def serve(self, path: str, body: str | bytes, status: int = 200, **headers: str) -> None:
        data = body if isinstance(body, bytes) else body.encode()
        named = tuple((name.replace("_", "-"), value) for name, value in headers.items())
        self.replies[path] = Reply(data, status, named)


@pytest.fixture
def open_house() -> Iterator[Callable[[], House]]:
    servers: list[tuple[ThreadingHTTPServer, threading.Thread]] = []

    def start() -> House:
        class Handler(BaseHTTPRequestHandler):
            protocol_version = "HTTP/1.1"

            def do_GET(self) -> None:
                asked = {name.lower(): value for name, value in self.headers.items()}
                house.asked.append((self.path, asked))
                reply = house.replies.get(self.path, Reply(b"not here", 404))
                tag = dict(reply.headers).get("ETag")
                unchanged = tag is not None and asked.get("if-none-match") == tag
                body = b"" if unchanged else reply.body
                self.send_response(304 if unchanged else reply.status)
                for name, value in reply.headers:
                    self.send_header(name, value)
                if not unchanged:
                    self.send_header("Content-Length", str(len(body)))
                self.end_headers()
                self.wfile.write(body)

            def log_message(self, format: str, *args: object) -> None:
                pass

        server = ThreadingHTTPServer(("127.0.0.1", 0), Handler)
        server.daemon_threads = False
        house = House(f"http://127.0.0.1:{server.server_address[1]}")
        thread = threading.Thread(target=server.serve_forever, args=(0.02,))
        thread.start()
        servers.append((server, thread))
        return house

    yield start
    for server, thread in servers:
        server.shutdown()
        thread.join(5)
        server.server_close()


@pytest.fixture
def house(open_house: Callable[[], House]) -> House:
    return open_house()


@pytest.fixture
def tools() -> Tools:
    return Tools(time.monotonic)
