"""Calls over HTTP that end in time. The only file that imports httpx and its transport, httpcore.

A time-out of httpx holds for one read, so a server that drips a byte a second never trips it. Here every
operation on a socket gets only what is left of one total deadline, headers and TLS handshake included. Only
the look-up of a host name is left to the limits of the operating system's resolver.

No error of this file holds an address, a header value or the text of a library's exception, since those may
carry secrets; nor do they chain to such an exception.
"""

import socket
import ssl
import typing
from collections.abc import Callable, Iterable, Iterator
from contextlib import suppress
from functools import cache
from types import MappingProxyType, TracebackType
from urllib.parse import urldefrag, urljoin, urlsplit

import httpcore
import httpx

from service.calls import (
    Answer,
    BodyTooLarge,
    Deadline,
    Fetch,
    FetchError,
    FetchFailed,
    FetchTimedOut,
    Headers,
    Monotonic,
    Post,
)

MOST_REDIRECTS = 3
MOST_ADDRESSES_TRIED = 4
PIECE_BYTES = 16_384
LARGEST_POST_ANSWER = 65_536
REDIRECTS = frozenset({301, 302, 303, 307, 308})
# What the library undoes piece by piece, growing a piece of 64 kB to at most about 66 MB.
CODINGS = frozenset({"", "identity", "gzip", "x-gzip", "deflate"})
OWN_HEADERS = (("User-Agent", "knickpoint"), ("Accept", "*/*"), ("Accept-Encoding", "gzip, deflate"))
CERTIFICATE_FAULTS = {
    10: "it has expired",
    18: "it is signed by itself",
    19: "an issuer signed by itself is not trusted here",
    20: "its issuer is not known here",
    62: "it is for another host",
    64: "it is for another host",
}


def fetch(request: Fetch, *, deadline_seconds: float, largest_body: int, monotonic: Monotonic) -> Answer:
    """One GET with a connection of its own."""
    with Session(Deadline.after(deadline_seconds, monotonic)) as session:
        return session.fetch(request, largest_body=largest_body)


def post(
    request: Post, *, deadline_seconds: float, monotonic: Monotonic, largest_body: int = LARGEST_POST_ANSWER
) -> Answer:
    """One POST with a connection of its own: no redirect is followed, nothing is tried again.

    The answer's body is what came of it, cut at `largest_body`: with the status, the post has arrived.
    """
    with Session(Deadline.after(deadline_seconds, monotonic)) as session:
        return session.post(request, largest_body=largest_body)


def host_of(address: str) -> str:
    """The host of an address that is no secret, to name it in a sentence."""
    try:
        return httpx.URL(address).host or "its address"
    except (httpx.InvalidURL, UnicodeError, ValueError):
        return "its address"


def join(address: str, reference: str) -> str:
    """The address that a reference found at `address` means (RFC 3986), without a fragment.

    Raises
    ------
    ValueError
        If it is none of http or https.
    """
    with suppress(ValueError):
        joined = urldefrag(urljoin(address, reference.strip())).url
        if _is_web(joined):
            return joined
    raise ValueError("no http or https address")


def same_origin(one: str, other: str) -> bool:
    """Whether what may be told to one address may be told to the other: same scheme, host and port.

    The step from http to https on the usual ports of one host counts as the same.
    """
    first, second = httpx.URL(one), httpx.URL(other)
    if first.host != second.host:
        return False
    ours, theirs = (first.scheme, _port(first)), (second.scheme, _port(second))
    return ours == theirs or (ours, theirs) == (("http", 80), ("https", 443))


class Session:
    """Calls that share their connections and one total deadline, such as the pages of one document."""

    def __init__(self, deadline: Deadline) -> None:
        self._deadline = deadline
        self._network = _TimedNetwork(deadline)
        self._client = httpx.Client(
            transport=_Transport(self._network),
            trust_env=False,
            follow_redirects=False,
            timeout=deadline.seconds,
        )

    def __enter__(self) -> "Session":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._client.close()

    def fetch(self, request: Fetch, *, largest_body: int) -> Answer:
        """GET, following at most `MOST_REDIRECTS`; secret headers stay with the first origin."""
        address, headers = request.address, request.headers
        for _ in range(MOST_REDIRECTS + 1):
            built = self._request("GET", address, request.named, (*request.open_headers, *headers), None)
            answer = self._get(built, request.named, largest_body)
            if answer.status not in REDIRECTS or "location" not in answer.headers:
                return answer
            onward = _onward(address, answer.headers["location"], request.named)
            headers = headers if same_origin(address, onward) else ()
            address = onward
        raise FetchFailed(request.named, f"it redirects more than {MOST_REDIRECTS} times")

    def post(self, request: Post, *, largest_body: int) -> Answer:
        """POST as it is, once."""
        built = self._request("POST", request.address, request.named, request.headers, request.body)

        def once() -> Answer:
            return self._send(built, lambda got: _as_far_as_it_came(got, largest_body))

        return self._guarded(once, request.named)

    def _get(self, built: httpx.Request, named: str, largest_body: int) -> Answer:
        """Once more, on a new connection, if one that was kept alive turns out to be closed."""
        connected = self._network.connected

        def once() -> Answer:
            return self._send(built, lambda got: _whole_body(got, named, largest_body))

        def with_a_new_connection() -> Answer:
            try:
                return once()
            except (httpcore.RemoteProtocolError, httpcore.ReadError, httpcore.WriteError):
                if self._network.connected != connected:
                    raise
                return once()

        return self._guarded(with_a_new_connection, named)

    def _send(self, built: httpx.Request, body_of: Callable[[httpx.Response], bytes]) -> Answer:
        response = self._client.send(built, stream=True)
        try:
            body = body_of(response)
        finally:
            response.close()
        headers = MappingProxyType({name.lower(): value for name, value in response.headers.items()})
        return Answer(response.status_code, headers, body, str(built.url))

    def _guarded(self, call: Callable[[], Answer], named: str) -> Answer:
        """Raise our own errors, outside of the handler so that none chains to a library's text."""
        try:
            return call()
        except (httpcore.TimeoutException, httpx.TimeoutException):
            failure: FetchError = FetchTimedOut(named, self._deadline.seconds)
        except (*_CALL_ERRORS, httpx.HTTPError, httpx.StreamError) as error:
            failure = FetchFailed(named, _reason(error))
        raise failure

    def _request(
        self, method: str, address: str, named: str, headers: Headers, body: bytes | None
    ) -> httpx.Request:
        _refuse_unsendable(named, headers)
        given = {name.lower() for name, _ in headers}
        every = [(name, value) for name, value in OWN_HEADERS if name.lower() not in given] + list(headers)
        if not _is_web(address):
            raise FetchFailed(named, "its address is no http or https address")
        return self._client.build_request(method, address, headers=every, content=body)


def _whole_body(response: httpx.Response, named: str, largest_body: int) -> bytes:
    if response.headers.get("content-encoding", "").strip().lower() not in CODINGS:
        raise FetchFailed(named, "it packs its answer in a way that was not asked for")
    announced = response.headers.get("content-length", "")
    if announced.isdecimal() and int(announced[:19]) > largest_body:
        raise BodyTooLarge(named, largest_body)
    body = bytearray()
    for piece in response.iter_bytes():
        body += piece
        if len(body) > largest_body:
            raise BodyTooLarge(named, largest_body)
    return bytes(body)


def _as_far_as_it_came(response: httpx.Response, largest_body: int) -> bytes:
    body = bytearray()
    with suppress(*_CALL_ERRORS):
        for piece in response.iter_raw():
            body += piece
            if len(body) >= largest_body:
                break
    return bytes(body[:largest_body])


def _onward(address: str, location: str, named: str) -> str:
    try:
        onward = join(address, location)
    except ValueError:
        onward = ""
    if not onward:
        raise FetchFailed(named, "it redirects to something that is no http or https address")
    if address.lower().startswith("https:") and not onward.startswith("https:"):
        raise FetchFailed(named, "it redirects from https to plain http")
    return onward


def _is_web(address: str) -> bool:
    """Whether both libraries can read it; each lets pass what the other refuses."""
    try:
        parts = urlsplit(address)
        return parts.scheme in ("http", "https") and parts.port != 0 and bool(httpx.URL(address).host)
    except (httpx.InvalidURL, UnicodeError, ValueError):
        return False


def _port(url: httpx.URL) -> int | None:
    return url.port or {"http": 80, "https": 443}.get(url.scheme)


def _refuse_unsendable(named: str, headers: Headers) -> None:
    """Before a library sees them, since its message would quote the value."""
    for name, value in headers:
        if not (name.isascii() and name.replace("-", "").replace("_", "").isalnum()):
            raise FetchFailed(named, "a header's name has characters other than letters, digits, - and _")
        if not (value.isascii() and (value.isprintable() or not value)) or value != value.strip():
            raise FetchFailed(
                named,
                f'the value of header "{name}" has characters that HTTP does not carry (only printable '
                "ASCII, without blanks or line ends around it)",
            )


def _reason(error: BaseException) -> str:
    """In our own words, by the kinds of error in the chain; their texts may quote the host."""
    for link in _chain(error):
        if isinstance(link, socket.gaierror | UnicodeError):
            return "the name of its host is not known"
        if isinstance(link, ssl.SSLCertVerificationError):
            fault = CERTIFICATE_FAULTS.get(link.verify_code, "it does not verify")
            return f"its certificate was refused, {fault}"
        if isinstance(link, ssl.SSLError):
            return "it does not speak TLS as we do"
        if isinstance(link, ConnectionRefusedError):
            return "it refuses the connection"
    if isinstance(error, httpcore.ConnectError):
        return "it cannot be reached"
    if isinstance(error, httpx.DecodingError):
        return "what it sent cannot be unpacked"
    return "the connection ended before the answer was complete"


def _chain(error: BaseException) -> Iterator[BaseException]:
    link: BaseException | None = error
    for _ in range(10):
        if link is None:
            return
        yield link
        link = link.__cause__ or link.__context__


_CALL_ERRORS = (
    httpcore.TimeoutException,
    httpcore.NetworkError,
    httpcore.ProtocolError,
    httpcore.UnsupportedProtocol,
    httpcore.ConnectionNotAvailable,
    OSError,
)


@cache
def _tls() -> ssl.SSLContext:
    return httpx.create_ssl_context(trust_env=False)


class _TimedNetwork(httpcore.NetworkBackend):
    """Opens connections whose every operation ends with the deadline, and counts them."""

    def __init__(self, deadline: Deadline) -> None:
        self._deadline = deadline
        self._plain = httpcore.SyncBackend()
        self.connected = 0

    def connect_tcp(
        self,
        host: str,
        port: int,
        timeout: float | None = None,  # noqa: ARG002 - the deadline stands in its place
        local_address: str | None = None,
        socket_options: Iterable[typing.Any] | None = None,
    ) -> httpcore.NetworkStream:
        self.connected += 1
        targets = _look_up(host, port)
        for left in range(len(targets), 0, -1):
            share = _left(self._deadline, httpcore.ConnectTimeout) / left
            try:
                stream = self._plain.connect_tcp(targets[-left], port, share, local_address, socket_options)
            except (httpcore.ConnectError, httpcore.ConnectTimeout):
                if left == 1:
                    raise
            else:
                return _TimedStream(stream, self._deadline)
        raise httpcore.ConnectError


class _TimedStream(httpcore.NetworkStream):
    """A connection whose every operation gets what is left of the deadline."""

    def __init__(self, stream: httpcore.NetworkStream, deadline: Deadline) -> None:
        self._stream, self._deadline = stream, deadline

    def read(self, max_bytes: int, timeout: float | None = None) -> bytes:  # noqa: ARG002
        return self._stream.read(max_bytes, _left(self._deadline, httpcore.ReadTimeout))

    def write(self, buffer: bytes, timeout: float | None = None) -> None:  # noqa: ARG002
        for start in range(0, len(buffer), PIECE_BYTES):
            piece = buffer[start : start + PIECE_BYTES]
            self._stream.write(piece, _left(self._deadline, httpcore.WriteTimeout))

    def close(self) -> None:
        self._stream.close()

    def start_tls(
        self,
        ssl_context: ssl.SSLContext,
        server_hostname: str | None = None,
        timeout: float | None = None,  # noqa: ARG002
    ) -> httpcore.NetworkStream:
        left = _left(self._deadline, httpcore.ConnectTimeout)
        return _TimedStream(self._stream.start_tls(ssl_context, server_hostname, left), self._deadline)

    def get_extra_info(self, info: str) -> typing.Any:
        return self._stream.get_extra_info(info)


def _look_up(host: str, port: int) -> list[str]:
    """The addresses of a host, each once, in the resolver's order."""
    try:
        found = socket.getaddrinfo(host, port, type=socket.SOCK_STREAM)
    except (OSError, UnicodeError) as error:
        raise httpcore.ConnectError from error
    return list(dict.fromkeys(str(entry[4][0]) for entry in found))[:MOST_ADDRESSES_TRIED]


def _left(deadline: Deadline, too_late: type[httpcore.TimeoutException]) -> float:
    left = deadline.remaining()
    if left <= 0:
        raise too_late
    return left


class _Transport(httpx.BaseTransport):
    """httpx over a connection pool that uses our network; the pool is closed with it."""

    def __init__(self, network: _TimedNetwork) -> None:
        self._pool = httpcore.ConnectionPool(ssl_context=_tls(), network_backend=network, max_connections=4)

    def handle_request(self, request: httpx.Request) -> httpx.Response:
        url = request.url
        target = httpcore.URL(scheme=url.raw_scheme, host=url.raw_host, port=url.port, target=url.raw_path)
        answer = self._pool.handle_request(
            httpcore.Request(
                method=request.method,
                url=target,
                headers=request.headers.raw,
                content=request.stream,
                extensions=request.extensions,
            )
        )
        return httpx.Response(answer.status, headers=answer.headers, stream=_Body(answer))

    def close(self) -> None:
        self._pool.close()


class _Body(httpx.SyncByteStream):
    """The body of an answer of the pool, whose connection is given back on closing."""

    def __init__(self, answer: httpcore.Response) -> None:
        self._answer = answer

    def __iter__(self) -> Iterator[bytes]:
        return self._answer.iter_stream()

    def close(self) -> None:
        self._answer.close()
