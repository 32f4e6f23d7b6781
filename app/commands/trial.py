"""``stonechat trial``."""

from __future__ import annotations

import argparse
import json

from app.catalogue_file import load_catalogue
from app.commands.files import read_file
from app.formats.strict_json import load_json
from app.formats.text import decode
from app.settings import load_settings
from app.trial import run_trial


def run(options: argparse.Namespace) -> int:
    """Assess the request in a file and print the answer as JSON."""
    settings = load_settings()
    source = str(options.file)
    document = load_json(decode(read_file(options.file), source), source)
    answer = run_trial(document, load_catalogue(), settings.mass_law)
    print(json.dumps(answer, indent=1, allow_nan=False))
    return 0
