"""The command line: parse, call, report. Exit status 0 done, 1 refused (one line on stderr), 2 usage."""

from __future__ import annotations

import argparse
import logging
import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path

from app import __version__
from app.commands import compute, demo, load, migrate, serve, trial
from app.core.advice.advisory import CAUTION
from app.core.sky.times import parse_utc
from app.errors import FieldError, StonechatError

DEFAULT_PORT = 8750
DEFAULT_HOST = "127.0.0.1"
INTERRUPTED = 130  # as shells report it


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status."""
    options = build_parser().parse_args(arguments)
    logging.basicConfig(
        format="%(levelname)s %(name)s: %(message)s", level=logging.WARNING, stream=sys.stderr
    )
    command: Callable[[argparse.Namespace], int] = options.command
    try:
        return command(options)
    except StonechatError as refusal:
        return _refuse(refusal.detail)
    except OSError as error:
        if isinstance(error, BrokenPipeError):
            return _reader_gone()
        return _refuse(f"{error.filename or 'system'}: {error.strerror or error}")
    except KeyboardInterrupt:
        return INTERRUPTED


def build_parser() -> argparse.ArgumentParser:
    """Describe every command and option."""
    parser = argparse.ArgumentParser(
        prog="stonechat",
        description="How much a meteoroid-stream passage raises the impact hazard, satellite by satellite, and when.",
        epilog=CAUTION,
    )
    parser.add_argument("--version", action="version", version=f"stonechat {__version__}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")

    one = _command(commands, "demo", demo.run, "compute and show an invented fleet, then serve it")
    one.add_argument("--once", action="store_true", help="stop after the printed outlook")
    one.add_argument("--port", type=_port, default=DEFAULT_PORT, help="port of the API (default %(default)s)")
    one.add_argument(
        "--dir", type=Path, help="keep the demo's database in this folder (default: a temporary one)"
    )

    one = _command(commands, "load", load.run, "take satellites and orbits from files")
    one.add_argument("files", nargs="+", type=Path, metavar="FILE", help="fleet (TOML, JSON), OMM or TLE")
    _add_dir(one)

    one = _command(
        commands, "compute", compute.run, "compute all registered satellites and publish the advisories"
    )
    one.add_argument("--as-of", type=_moment, metavar="T", help="compute as of this time (default: now)")
    one.add_argument("--satellite", action="append", metavar="ID", help="only this one; may be repeated")
    _add_dir(one)

    one = _command(commands, "trial", trial.run, "assess one attitude at given states; needs no database")
    one.add_argument("file", type=Path, metavar="FILE.json", help="the request; - reads standard input")

    one = _command(commands, "serve", serve.run, "serve the API and compute the runs asked for")
    one.add_argument("--port", type=_port, default=DEFAULT_PORT, help="(default %(default)s)")
    one.add_argument("--host", default=DEFAULT_HOST, help="address to listen on (default %(default)s)")
    _add_dir(one)

    one = _command(commands, "migrate", migrate.run, "bring the database to the newest schema")
    _add_dir(one)
    return parser


def _command(
    commands: argparse._SubParsersAction[argparse.ArgumentParser],
    name: str,
    run: Callable[[argparse.Namespace], int],
    summary: str,
) -> argparse.ArgumentParser:
    parser = commands.add_parser(
        name, help=summary, description=f"{summary[0].upper()}{summary[1:]}.", epilog=CAUTION
    )
    parser.set_defaults(command=run)
    return parser


def _add_dir(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--dir", type=Path, help="folder of the SQLite file (default: STONECHAT_DIR, else the current folder)"
    )


def _port(text: str) -> int:
    if not (text.isascii() and text.isdigit() and 0 < int(text) < 65536):
        raise argparse.ArgumentTypeError(f"'{text}' is not a port between 1 and 65535")
    return int(text)


def _moment(text: str) -> float:
    try:
        return parse_utc(text)
    except FieldError as error:
        raise argparse.ArgumentTypeError(error.problem) from None


def _refuse(reason: str) -> int:
    print(f"stonechat: {' '.join(reason.split())}", file=sys.stderr)
    return 1


def _reader_gone() -> int:
    # The program that read our output has ended; the interpreter must not complain when it flushes at exit.
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return 1
