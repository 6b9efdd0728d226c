"""Serving the dashboard: on this machine only, with nothing fetched from outside."""

import errno
import gc
import signal
import sys
from typing import Any
from urllib.parse import urlsplit

import panel as pn
from bokeh.server.views.ws import WSHandler
from panel.io.server import get_server
from tornado.httputil import HTTPHeaders, HTTPServerRequest
from tornado.web import OutputTransform

from app.evaluation import start_workers
from app.ready import ready_contours
from app.views.shell import page
from engine.study import Study

__all__ = ["DEFAULT_PORT", "serve"]

ADDRESS = "127.0.0.1"
DEFAULT_PORT = 8463

# A picture of the last second is worth more than one from a lost laptop lid: sessions whose
# window is gone are kept for two minutes, so that a reload or a short sleep loses nothing.
_SESSION_LIFETIME_MS = 120_000

_POLICY = (
    "default-src 'self' data: blob:",
    # BokehJS builds functions from text.
    "script-src 'self' 'unsafe-inline' 'unsafe-eval' blob:",
    "style-src 'self' 'unsafe-inline'",
    "connect-src 'self' blob: data: ws://127.0.0.1:* ws://localhost:*",
    "frame-ancestors 'none'",
    "form-action 'none'",
    "base-uri 'self'",
)

_HEADERS = {
    "Content-Security-Policy": "; ".join(_POLICY),
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    "Cross-Origin-Opener-Policy": "same-origin",
}


def serve(study: Study | None, port: int | None = None, browser: bool = True) -> int:
    """Serve the dashboard until interrupted.

    Parameters
    ----------
    study : Study or None
        The study that new sessions open with.
    port : int or None
        Port to listen on; None takes the usual one, or any free one when it is taken.
    browser : bool
        Whether to open a browser window.

    Returns
    -------
    int
        Exit code: 0 after an orderly stop, 1 when the port cannot be had.
    """
    quicken_sockets()
    _spare_collections()
    start_workers()
    ready_contours()  # before the first page asks for it
    try:
        server = _listen(study, port)
    except OSError as error:
        print(f"sparsereach: port {port}: {error.strerror or error}", file=sys.stderr)
        return 1
    url = f"http://{ADDRESS}:{server.port}/"
    print(f"sparsereach is at {url} (Ctrl-C ends it)", file=sys.stderr, flush=True)
    if browser:
        server.io_loop.add_callback(server.show, "/")
    _stop_on_signals(server)
    server.start()
    server.io_loop.start()
    server.stop()
    return 0


def _spare_collections() -> None:
    """Look for garbage seldom, and not among what was imported: a full look takes 10 ms."""
    gc.collect()
    gc.freeze()
    gc.set_threshold(20_000, 50, 100)


def quicken_sockets() -> None:
    """Let small messages leave at once: Bokeh leaves the delay of Nagle's algorithm on."""
    if getattr(WSHandler.open, "quick", False):
        return
    plain_open = WSHandler.open

    def quick_open(self: WSHandler, *args: Any, **kwargs: Any) -> Any:
        self.set_nodelay(True)
        return plain_open(self, *args, **kwargs)

    quick_open.quick = True  # type: ignore[attr-defined]
    WSHandler.open = quick_open


class Guard(OutputTransform):
    """Add security headers to every answer, and refuse foreign Host headers.

    Without the check a page elsewhere could point its own name at this machine and read the
    dashboard through it.
    """

    def __init__(self, request: HTTPServerRequest) -> None:
        self._local = urlsplit(f"//{request.host}").hostname in (ADDRESS, "localhost")

    def transform_first_chunk(
        self, status_code: int, headers: HTTPHeaders, chunk: bytes, finishing: bool
    ) -> tuple[int, HTTPHeaders, bytes]:
        """Rewrite the head of the answer, and its body when the host is foreign."""
        headers.update(_HEADERS)
        if self._local:
            return status_code, headers, chunk
        refusal = b"This dashboard answers to localhost only."
        headers["Content-Length"] = str(len(refusal))
        headers["Content-Type"] = "text/plain"
        return 403, headers, refusal


def _listen(study: Study | None, port: int | None) -> Any:
    if port is not None:
        return _server(study, port)
    try:
        return _server(study, DEFAULT_PORT)
    except OSError as error:
        if error.errno != errno.EADDRINUSE:
            raise
        return _server(study, 0)


def _server(study: Study | None, port: int) -> Any:
    pn.extension()
    server = get_server(
        {"/": lambda: page(study)},
        address=ADDRESS,
        port=port,
        title="sparsereach",
        liveness=True,
        start=False,
        show=False,
        check_unused_sessions_milliseconds=15_000,
        unused_session_lifetime_milliseconds=_SESSION_LIFETIME_MS,
        websocket_origin=[f"{ADDRESS}:{port}", f"localhost:{port}"] if port else None,
    )
    if not port:
        origins = server._tornado._websocket_origins
        origins |= {f"{ADDRESS}:{server.port}", f"localhost:{server.port}"}
    server._tornado.add_transform(Guard)
    return server


def _stop_on_signals(server: Any) -> None:
    def stop(*_: Any) -> None:
        server.io_loop.add_callback_from_signal(server.io_loop.stop)

    signal.signal(signal.SIGINT, stop)
    signal.signal(signal.SIGTERM, stop)
