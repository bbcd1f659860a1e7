"""The terminal interface in a browser, for a shared screen: bound to this machine only.

It refuses any other address, since there is no login, no encryption and no read-only guard: whoever reaches
the page acts as the user who started it, with that user's book and initials. Other pages open in the same browser
could reach it too; so a request must name this machine as the host it wants, and as the page it comes from if it
names one. The page itself may load nothing from elsewhere.
"""

from __future__ import annotations

import shlex
import sys
from typing import Any

from kb.errors import SettingsError, SidepathError

LOOPBACK = ("127.0.0.1", "localhost", "::1")

WARNING = (
    "No login, no encryption: whoever opens this page on this machine acts as you, with your book and initials. "
    "Ctrl+C ends it."
)


def serving_command(book: str | None, who: str | None) -> str:
    """Return the command that each browser session runs."""
    words = [sys.executable, "-m", "kb"]
    if book is not None:
        words += ["--book", book]
    if who is not None:
        words += ["--as", who]
    return shlex.join([*words, "tui"])


def is_from_here(host: str, origin: str | None, port: int) -> bool:
    """Return whether a request is meant for this server and comes from its own page.

    Args:
        host: the header of that name. origin: likewise; None = a browser names none when a page is opened by hand.

    >>> is_from_here("127.0.0.1:8317", "http://localhost:8317", 8317)
    True
    >>> is_from_here("127.0.0.1:8317", "http://example.org", 8317)
    False
    >>> is_from_here("example.org:8317", None, 8317)
    False
    """
    names = {f"[{name}]" if ":" in name else name for name in LOOPBACK}
    hosts = {f"{name}:{port}" for name in names} | (names if port == 80 else set())
    return host in hosts and (origin is None or origin in {f"http://{one}" for one in hosts})


def page_rules(port: int) -> str:
    """Return the rules for the page: scripts, styles and fonts of this server only, and one line back to it."""
    here = " ".join(f"{scheme}://{name}:{port}" for scheme in ("http", "ws") for name in ("127.0.0.1", "localhost"))
    return (
        f"default-src 'self' {here}; script-src 'self' {here} 'unsafe-inline' 'wasm-unsafe-eval'; "
        f"style-src 'self' {here} 'unsafe-inline'; img-src 'self' {here} data:; font-src 'self' {here} data:; "
        "frame-ancestors 'none'; base-uri 'none'; form-action 'none'"
    )


def make_server(command: str, host: str, port: int) -> Any:
    """Return the server, not yet serving.

    Raises:
        SidepathError: the extra `browser` is not installed.
    """
    try:
        from aiohttp import web
        from textual_serve.server import Server
    except ImportError as error:
        raise SidepathError(
            "Serving to a browser needs the package textual-serve.", "Install it with: pip install 'sidepath[browser]'."
        ) from error

    def need_from_here(request: web.Request) -> None:
        if not is_from_here(request.headers.get("Host", ""), request.headers.get("Origin"), port):
            raise web.HTTPForbidden(text="This page answers its own machine only.")

    class LoopbackServer(Server):
        """A server that answers its own page only."""

        async def on_startup(self, app: web.Application) -> None:
            self.console.print(f"Sidepath at {self.public_url}", highlight=False)
            self.console.print(WARNING, highlight=False)

        async def handle_index(self, request: web.Request) -> web.StreamResponse:
            need_from_here(request)
            response: web.StreamResponse = await super().handle_index(request)
            response.headers["Content-Security-Policy"] = page_rules(port)
            return response

        async def handle_websocket(self, request: web.Request) -> Any:
            need_from_here(request)
            return await super().handle_websocket(request)

    shown = f"[{host}]" if ":" in host else host
    return LoopbackServer(command, host=host, port=port, title="Sidepath", public_url=f"http://{shown}:{port}")


def serve_on_loopback(book: str | None, who: str | None, port: int, host: str = "127.0.0.1") -> None:
    """Serve until interrupted.

    Raises:
        SettingsError: an address that is not this machine.
        SidepathError: the extra `browser` is not installed.
    """
    if host not in LOOPBACK:
        raise SettingsError(
            f"{host!r} is not this machine.", "Serve on 127.0.0.1; share it by screen or by tunnel.", host
        )
    make_server(serving_command(book, who), host, port).serve()
