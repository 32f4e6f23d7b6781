"""The command line: parse, call, report. Exit status 0 done, 1 refused (one line on stderr), 2 usage."""

from __future__ import annotations

import argparse
import importlib
import io
import logging
import os
import signal
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from types import FrameType

from sqlalchemy.exc import SQLAlchemyError

from app import __version__
from app.commands.files import os_problem, printable
from app.core.advice.advisory import CAUTION
from app.core.sky.times import parse_utc
from app.errors import FieldError, StonechatError

DEFAULT_PORT = 8750
DEFAULT_HOST = "127.0.0.1"
# As shells report a program that a signal ended: 128 and the signal's number.
INTERRUPTED = 130
TERMINATED = 143
READER_GONE = 141


class Terminated(KeyboardInterrupt):
    """SIGTERM: a service manager asks us to stop; treated like Ctrl-C, so that everything is put away."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status."""
    _open_closed_streams()
    options = build_parser().parse_args(argv)
    logging.basicConfig(format="%(levelname)s %(name)s: %(message)s", level=logging.WARNING)
    try:
        with _stoppable():
            return _run(options)
    except BrokenPipeError:
        return _reader_gone()
    except Terminated:
        return TERMINATED
    except KeyboardInterrupt:
        print("stonechat: interrupted", file=sys.stderr)
        return INTERRUPTED


def _open_closed_streams() -> None:
    """Give a standard stream that we were started without to nobody, before a database is opened in its place."""
    for name, mode in (("stdin", "r"), ("stdout", "w"), ("stderr", "w")):
        if getattr(sys, name) is None:
            setattr(sys, name, os.fdopen(os.open(os.devnull, os.O_RDWR), mode))


def _run(options: argparse.Namespace) -> int:
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="backslashreplace")  # a name must not stop an ASCII-only terminal
    command: Callable[[argparse.Namespace], int] = importlib.import_module(options.module).run
    try:
        status = command(options)
        sys.stdout.flush()  # here, where a reader that has gone is dealt with
        return status
    except StonechatError as refusal:
        return _refuse(refusal.detail)
    except SQLAlchemyError as error:
        return _refuse(f"the database failed: {getattr(error, 'orig', None) or error}")
    except BrokenPipeError:
        raise
    except OSError as error:
        return _refuse(os_problem(error))


def build_parser() -> argparse.ArgumentParser:
    """Describe every command and option."""
    parser = argparse.ArgumentParser(
        prog="stonechat",
        description="How much a meteoroid-stream passage raises the impact hazard, satellite by satellite, and when.",
        epilog=CAUTION,
    )
    parser.add_argument("--version", action="version", version=f"stonechat {__version__}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")

    one = _command(commands, "demo", "compute and show an invented fleet, then serve it")
    one.add_argument("--once", action="store_true", help="stop after the printed outlook")
    one.add_argument("--port", type=_port, default=DEFAULT_PORT, help="port of the API (default %(default)s)")
    one.add_argument("--dir", type=Path, help="keep the demo's database here (default: a temporary folder)")

    one = _command(commands, "load", "take satellites and orbits from files")
    one.add_argument("files", nargs="+", type=Path, metavar="FILE", help="fleet (TOML, JSON), OMM or TLE")
    _add_dir(one)

    one = _command(commands, "compute", "compute the registered satellites and publish the advisories")
    one.add_argument("--as-of", type=_moment, metavar="T", help="compute as of this time (default: now)")
    one.add_argument(
        "--satellite", nargs="+", action="extend", metavar="ID", help="only these (default: all)"
    )
    _add_dir(one)

    one = _command(commands, "trial", "assess one attitude at given states; needs no database")
    one.add_argument("file", type=Path, metavar="FILE.json", help="the request; - reads standard input")

    one = _command(commands, "serve", "serve the API and compute the runs asked for")
    one.add_argument("--port", type=_port, default=DEFAULT_PORT, help="(default %(default)s)")
    one.add_argument("--host", default=DEFAULT_HOST, help="address to listen on (default %(default)s)")
    _add_dir(one)

    _add_dir(_command(commands, "migrate", "bring the database to the newest schema"))
    return parser


def _command(
    commands: argparse._SubParsersAction[argparse.ArgumentParser], name: str, summary: str
) -> argparse.ArgumentParser:
    description = f"{summary[0].upper()}{summary[1:]}."
    parser = commands.add_parser(name, help=summary, description=description, epilog=CAUTION)
    # Imported when it is called: `trial` need not wait for the server's libraries, nor `--help` for any.
    parser.set_defaults(module=f"app.commands.{name}")
    return parser


def _add_dir(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--dir", type=Path, help="folder of the SQLite file (default: STONECHAT_DIR, else the current folder)"
    )


def _port(text: str) -> int:
    if not (text.isascii() and text.isdigit() and len(text) <= 5 and 0 < int(text) < 65536):
        raise argparse.ArgumentTypeError(f"{text!r} is not a port between 1 and 65535")
    return int(text)


def _moment(text: str) -> float:
    try:
        return parse_utc(text)
    except FieldError as error:
        raise argparse.ArgumentTypeError(printable(error.problem)) from None


@contextmanager
def _stoppable() -> Iterator[None]:
    """Turn SIGTERM into an exception, so that folders are removed and a run under way is marked."""

    def stop(_number: int, _frame: FrameType | None) -> None:
        raise Terminated

    before = signal.signal(signal.SIGTERM, stop)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)


def _refuse(reason: str) -> int:
    print(f"stonechat: {printable(' '.join(reason.split()))}", file=sys.stderr)
    return 1


def _reader_gone() -> int:
    # The program that read our output has ended; the interpreter must not complain when it flushes at exit.
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return READER_GONE


if __name__ == "__main__":
    sys.exit(main())
