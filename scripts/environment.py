"""Environments for the scripts: outside the checkout, kept between runs, made with the standard library and pip only.

``core`` holds the dependencies and the development tools, ``extras`` adds the optional ones on top of ``core``. Each
run gets a small environment of its own on top of one of the two, into which the freshly built wheel is installed, so
that two runs at once do not disturb each other.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import subprocess
import sys
import tempfile
import time
import tomllib
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
OLDEST = (3, 11)


class Failed(Exception):
    """A stage did not pass; its output has been printed."""


def cache_dir() -> Path:
    """Where environments are kept: ``PROPDB_DEV_CACHE``, or the cache directory of the platform."""
    named = os.environ.get("PROPDB_DEV_CACHE")
    if named:
        return Path(named).resolve()
    if sys.platform == "win32":
        base = Path(os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local")
    elif sys.platform == "darwin":
        base = Path.home() / "Library" / "Caches"
    else:
        base = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")
    return base / "propdb-dev"


def python_of(environment: Path) -> Path:
    """Return the interpreter of a virtual environment."""
    return environment / ("Scripts/python.exe" if sys.platform == "win32" else "bin/python")


def clean_variables(**changes: str) -> dict[str, str]:
    """Return this process's variables without those that would leak a checkout or a store into a child."""
    dropped = ("PYTHONPATH", "PYTHONHOME", "VIRTUAL_ENV", "PROPDB_STORE", "PYTEST_ADDOPTS", "PYTHONDONTWRITEBYTECODE")
    kept = {key: value for key, value in os.environ.items() if key not in dropped}
    return kept | changes


def call(command: Sequence[str | Path], *, cwd: Path = ROOT, what: str = "") -> str:
    """Run a command and return what it printed; print that and raise :class:`Failed` if it fails."""
    done = subprocess.run(
        [str(part) for part in command],
        cwd=cwd,
        env=clean_variables(PIP_DISABLE_PIP_VERSION_CHECK="1"),
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        encoding="utf-8",
        errors="replace",
        check=False,
    )
    if done.returncode:
        print(done.stdout)
        raise Failed(what or " ".join(str(part) for part in command[:4]))
    return done.stdout


@contextmanager
def stage(name: str) -> Iterator[None]:
    """Print one short line: the name of the stage, whether it passed, and how long it took."""
    print(f"{name:<28}", end="", flush=True)
    begin = time.monotonic()
    try:
        yield
    except Failed:
        print(f"{name:<28}FAILED {time.monotonic() - begin:6.1f} s", flush=True)
        raise
    print(f"ok {time.monotonic() - begin:6.1f} s", flush=True)


def requirements(*extras: str) -> list[str]:
    """Return the requirements of the project, with those of ``extras``, as pyproject.toml states them."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    wanted = list(project["dependencies"])
    for extra in extras:
        for line in project["optional-dependencies"][extra]:
            if line.startswith("propdb["):
                wanted += requirements(*line[len("propdb[") : -1].split(","))
            else:
                wanted.append(line)
    return sorted(set(wanted))


def base(name: str, *extras: str, below: Path | None = None) -> Path:
    """Return an environment with the dependencies, made on first use; on top of another one if ``below`` is given."""
    wanted = requirements(*extras)
    digest = hashlib.sha256("\n".join([sys.executable, sys.version, str(below or ""), *wanted]).encode()).hexdigest()
    environment = cache_dir() / f"{name}-{digest[:12]}"
    if (environment / "ready").exists():
        return environment
    cache_dir().mkdir(parents=True, exist_ok=True)
    with _only_one(environment.with_suffix(".making")):
        if not (environment / "ready").exists():
            shutil.rmtree(environment, ignore_errors=True)
            call([sys.executable, "-m", "venv", environment], what="python -m venv (is the venv module installed?)")
            if below:
                _stand_on(environment, below)
            call([python_of(environment), "-m", "pip", "install", "--quiet", *wanted], what="pip install")
            (environment / "ready").write_text("\n".join(wanted) + "\n", encoding="utf-8")
    return environment


@contextmanager
def _only_one(lock: Path) -> Iterator[None]:
    """Let one process at a time make an environment; a lock older than half an hour is taken for dead."""
    while True:
        try:
            lock.mkdir()
            break
        except FileExistsError:
            try:
                if time.time() - lock.stat().st_mtime > 1800:
                    lock.rmdir()
                    continue
            except FileNotFoundError:
                continue
            time.sleep(0.5)
    try:
        yield
    finally:
        lock.rmdir()


def _site_packages(environment: Path) -> Path:
    if sys.platform == "win32":
        return environment / "Lib" / "site-packages"
    return environment / "lib" / f"python{sys.version_info[0]}.{sys.version_info[1]}" / "site-packages"


def _stand_on(environment: Path, below: Path) -> None:
    """Make the packages of ``below`` importable in ``environment``."""
    line = f"import site; site.addsitedir({str(_site_packages(below))!r})\n"
    (_site_packages(environment) / "below.pth").write_text(line, encoding="utf-8")


def build_wheel(target: Path, below: Path) -> Path:
    """Build the wheel of the checkout into ``target`` with the pip of ``below``."""
    build = ["wheel", "--quiet", "--no-deps", "--wheel-dir", target, ROOT]
    call([python_of(below), "-m", "pip", *build], what="pip wheel")
    (wheel,) = target.glob("propdb-*.whl")
    return wheel


def with_wheel(target: Path, wheel: Path, below: Path) -> Path:
    """Make the environment ``target`` on top of ``below`` and install the wheel into it; return its interpreter."""
    call([sys.executable, "-m", "venv", "--without-pip", target])
    _stand_on(target, below)
    python = python_of(target)
    install = ["install", "--quiet", "--no-deps", "--no-index", "--ignore-installed", wheel]
    call([python, "-m", "pip", *install], what="pip install of the wheel")
    return python


def copy_tests(target: Path) -> Path:
    """Copy what the tests read, and nothing of the package, to a directory outside the checkout."""
    target.mkdir(parents=True)
    ignore = shutil.ignore_patterns("__pycache__", ".hypothesis")
    for name in ("tests", "scripts", "seeds_data"):
        shutil.copytree(ROOT / name, target / name, ignore=ignore)
    for file in ROOT.iterdir():
        if file.is_file() and (file.suffix in {".md", ".toml"} or file.name in {"LICENSE", "NOTICE"}):
            shutil.copy2(file, target / file.name)
    return target


@contextmanager
def work_dir() -> Iterator[Path]:
    """Give a temporary directory outside the checkout."""
    with tempfile.TemporaryDirectory(prefix="propdb-", ignore_cleanup_errors=True) as name:
        yield Path(name).resolve()


def check_python() -> None:
    """Stop with one line if the interpreter is too old."""
    if sys.version_info < OLDEST:
        raise SystemExit(f"Python {OLDEST[0]}.{OLDEST[1]} or newer is needed, this is {sys.version.split()[0]}")
