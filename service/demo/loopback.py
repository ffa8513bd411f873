"""Small HTTP servers that only this machine can reach."""

import socketserver
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer

LONGEST_WAIT_SECONDS = 5.0


class Server(ThreadingHTTPServer):
    """One server on a free port of the loopback interface."""

    def server_bind(self) -> None:
        """Bind without asking for the machine's full name, which can hang where there is no network."""
        socketserver.TCPServer.server_bind(self)
        self.server_name, self.server_port = "127.0.0.1", int(self.server_address[1])


class Handler(BaseHTTPRequestHandler):
    """What the handlers of the demo have in common."""

    timeout = LONGEST_WAIT_SECONDS

    def answer(self, status: int, body: bytes = b"", *, etag: str | None = None) -> None:
        """Send a whole answer; the body is JSON."""
        self.send_response(status)
        if etag is not None:
            self.send_header("ETag", etag)
        if body:
            self.send_header("Content-Type", "application/json")
        self.send_header("Content-Length", str(len(body)))
        self.end_headers()
        self.wfile.write(body)

    def log_message(self, format: str, *args: object) -> None:
        """Nothing: the screen belongs to the story."""


@contextmanager
def serving(handler: type[Handler]) -> Iterator[str]:
    """Serve for as long as the block lasts; gives the address without a path."""
    with Server(("127.0.0.1", 0), handler) as server:
        thread = threading.Thread(target=server.serve_forever, args=(0.05,), daemon=True)
        thread.start()
        try:
            yield f"http://127.0.0.1:{server.server_port}"
        finally:
            server.shutdown()
            thread.join(LONGEST_WAIT_SECONDS)
