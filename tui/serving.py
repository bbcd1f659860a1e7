"""The terminal interface in a browser, for a shared screen: bound to this machine only.

It refuses any other address, since there is no login, no encryption and no read-only guard: whoever reaches
the page acts as the user who started it, with that user's book and initials.
"""

from __future__ import annotations

import shlex
import sys

from kb.errors import SettingsError, SidepathError

LOOPBACK = ("127.0.0.1", "localhost", "::1")


def serving_command(book: str | None, who: str | None) -> str:
    """Return the command that each browser session runs."""
    words = [sys.executable, "-m", "kb"]
    if book is not None:
        words += ["--book", book]
    if who is not None:
        words += ["--as", who]
    return shlex.join([*words, "tui"])


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
    try:
        from textual_serve.server import Server
    except ImportError as error:
        raise SidepathError(
            "Serving to a browser needs the package textual-serve.", "Install it with: pip install 'sidepath[browser]'."
        ) from error
    Server(serving_command(book, who), host=host, port=port, title="Sidepath").serve()
