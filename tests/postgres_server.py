"""A PostgreSQL server for the tests: made in a temporary folder, reached by its socket, gone afterwards."""

from __future__ import annotations

import os
import pwd
import shutil
import subprocess
import tempfile
from importlib.util import find_spec
from itertools import count
from pathlib import Path

_NUMBERS = count(1)


def binaries() -> Path | None:
    """Folder of the newest PostgreSQL server that is installed as Debian does, or on the path."""
    installed = sorted(Path("/usr/lib/postgresql").glob("*/bin/initdb"), key=lambda p: float(p.parts[4]))
    found = shutil.which("initdb")
    return installed[-1].parent if installed else Path(found).resolve().parent if found else None


def why_not() -> str | None:
    """Why no server can be started; ``None`` if one can."""
    if find_spec("psycopg") is None:
        return "psycopg is not installed"
    if binaries() is None:
        return "no PostgreSQL server is installed (Debian: apt-get install postgresql)"
    if os.getuid() == 0 and _user() is None:
        return "PostgreSQL does not run as root, and there is no user postgres"
    return None


class PostgresServer:
    """A running server; a context manager."""

    def __enter__(self) -> PostgresServer:
        self._folder = Path(tempfile.mkdtemp(prefix="pg-"))
        self._user = _user() if os.getuid() == 0 else None
        if self._user:
            shutil.chown(self._folder, self._user)
        self._call("initdb", "-D", "data", "-U", "tests", "-A", "trust", "-E", "UTF8", "--no-sync")
        settings = f"-c listen_addresses= -c unix_socket_directories={self._folder} -c fsync=off"
        self._call("pg_ctl", "-D", "data", "-w", "-l", "log", "-o", settings, "start")
        return self

    def __exit__(self, *_: object) -> None:
        self._call("pg_ctl", "-D", "data", "-w", "-m", "immediate", "stop")
        shutil.rmtree(self._folder, ignore_errors=True)

    def new_schema(self) -> str:
        """URL of a schema that is still empty."""
        import psycopg

        name = f"catalog_{next(_NUMBERS)}"
        with psycopg.connect(
            f"host={self._folder} user=tests dbname=postgres", autocommit=True
        ) as connection:
            connection.execute(f"CREATE SCHEMA {name}")
        return f"postgresql+psycopg://tests@/postgres?host={self._folder}&options=-csearch_path%3D{name}"

    def _call(self, program: str, *arguments: str) -> None:
        # Into a file, as the server would keep a pipe open.
        with tempfile.TemporaryFile() as output:
            done = subprocess.run(
                [binaries() / program, *arguments],
                cwd=self._folder,
                user=self._user,
                stdin=subprocess.DEVNULL,
                stdout=output,
                stderr=output,
                timeout=60,
            )
            if done.returncode:
                output.seek(0)
                raise RuntimeError(f"{program}: {output.read().decode()}")


def _user() -> str | None:
    """The user that Debian's package makes for the server."""
    try:
        return pwd.getpwnam("postgres").pw_name
    except KeyError:
        return None
