"""``stonechat trial``."""

from __future__ import annotations

import argparse
import json
import sys

from app.catalogue_file import load_catalogue
from app.formats.strict_json import load_json
from app.formats.text import decode
from app.settings import load_settings
from app.trial import run_trial


def run(options: argparse.Namespace) -> int:
    """Assess the request in a file and print the answer as JSON."""
    settings = load_settings()
    name = str(options.file)
    data = sys.stdin.buffer.read() if name == "-" else options.file.read_bytes()
    document = load_json(decode(data, name), name)
    answer = run_trial(document, load_catalogue(), settings.mass_law)
    print(json.dumps(answer, indent=1, allow_nan=False))
    return 0
