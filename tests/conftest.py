"""Fixtures that several test files share."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import pandas as pd
import pvlib
import pytest

if TYPE_CHECKING:
    from postgres_server import PostgresServer


#: More workers than this only take memory.
MOST_WORKERS = 8


@pytest.hookimpl(tryfirst=True)
def pytest_cmdline_main(config: pytest.Config) -> None:
    """Run the whole suite on all cores by pytest-xdist, but a topic in this process; ``-n`` says otherwise."""
    asked = config.option
    whole = all(os.path.isdir(argument) for argument in config.args) and not asked.keyword
    in_worker = hasattr(config, "workerinput")
    if whole and not in_worker and getattr(asked, "numprocesses", 0) is None and asked.dist == "no":
        asked.numprocesses, asked.dist = "auto", "worksteal"
        asked.maxprocesses = asked.maxprocesses or MOST_WORKERS


def _made_once(factory: pytest.TempPathFactory, name: str, make: Callable[[Path], None]) -> Path:
    """A file that all workers share: the first that wants it makes it, the others wait for it."""
    if "PYTEST_XDIST_WORKER" not in os.environ:
        path = factory.mktemp("shared") / name
        make(path)
        return path
    from filelock import FileLock

    path = factory.getbasetemp().parent / name
    with FileLock(f"{path}.lock"):
        if not path.exists():
            draft = path.with_name(f"draft-{name}")
            make(draft)
            draft.replace(path)
    return path


class Ran(NamedTuple):
    """What a command did: exit status, stdout and stderr."""

    status: int
    out: str
    err: str


@pytest.fixture(scope="session")
def cec_modules_path() -> Path:
    """The CEC module table in pvlib's data folder."""
    return _cec_path("modules")


@pytest.fixture(scope="session")
def cec_inverters_path() -> Path:
    """The CEC inverter table in pvlib's data folder."""
    return _cec_path("inverters")


@pytest.fixture(scope="session")
def cec_modules_csv(cec_modules_path: Path) -> pd.DataFrame:
    """The CEC module table as pandas reads it; rows 2 and 3 are units and variable names."""
    return pd.read_csv(cec_modules_path, skiprows=[1, 2])


@pytest.fixture(scope="session")
def cec_inverters_csv(cec_inverters_path: Path) -> pd.DataFrame:
    """The CEC inverter table as pandas reads it."""
    return pd.read_csv(cec_inverters_path, skiprows=[1, 2])


def _cec_path(kind: str) -> Path:
    return max((Path(pvlib.__file__).parent / "data").glob(f"sam-library-cec-{kind}-*.csv"))


@pytest.fixture(scope="session")
def cec_catalog(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A catalog with both public tables. It is shared: open it for reading, or copy it."""
    from catalog.cec import read_cec_inverters, read_cec_modules
    from catalog.store import Catalog

    def make(path: Path) -> None:
        with Catalog.open(path, create=True) as catalog:
            catalog.load(read_cec_modules(), read_cec_inverters())

    return _made_once(tmp_path_factory, "cec.sqlite", make)


@pytest.fixture(scope="session")
def small_path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The catalog of `small_catalog`. It is shared: copy it."""
    from catalog_records import INVERTERS, MODULES, SITE

    from catalog.store import Catalog

    path = tmp_path_factory.mktemp("small") / "small.sqlite"
    with Catalog.open(path, create=True) as catalog:
        catalog.load(MODULES, INVERTERS)
        catalog.add_site(SITE)
    return path


@pytest.fixture
def small_catalog(small_path: Path, tmp_path: Path) -> Path:
    """A catalog with two modules, two inverters and a site, all invented; the test may change it."""
    return Path(shutil.copy(small_path, tmp_path))


@pytest.fixture(scope="session")
def demo_path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demo's catalog. It is shared: copy it."""
    from cli.main import run

    def make(path: Path) -> None:
        assert run(["demo", "--keep", str(path)]) == 0

    return _made_once(tmp_path_factory, "demo.sqlite", make)


@pytest.fixture
def demo_catalog(demo_path: Path, tmp_path: Path) -> Path:
    """The demo's catalog for one test, where the fixture `ferrule` looks for one."""
    return Path(shutil.copy(demo_path, tmp_path / "small.sqlite"))


@pytest.fixture(scope="session")
def postgres_server() -> Iterator[PostgresServer]:
    """A PostgreSQL server of the tests' own."""
    from postgres_server import PostgresServer, why_not

    reason = why_not()
    if reason:
        pytest.skip(reason)
    with PostgresServer() as server:
        yield server


@pytest.fixture(params=["sqlite", "postgresql"])
def store_location(request: pytest.FixtureRequest, tmp_path: Path) -> str:
    """Where a test of the store may make its catalog: a file, then an empty schema of a database."""
    if request.param == "sqlite":
        return str(tmp_path / "catalog.sqlite")
    return request.getfixturevalue("postgres_server").new_schema()


@pytest.fixture
def ferrule(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Callable[..., Ran]:
    """Run a command line in this process; its catalog is that of `small_catalog` or `demo_catalog`, if the test
    asks for one."""
    from cli.main import run

    monkeypatch.setenv("FERRULE_CATALOG", str(tmp_path / "small.sqlite"))
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "data"))

    def ferrule(*arguments: object) -> Ran:
        capsys.readouterr()
        status = run([str(argument) for argument in arguments])
        return Ran(status, *capsys.readouterr())

    return ferrule
