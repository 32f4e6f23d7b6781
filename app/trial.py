"""One door for a trial, used by the command line and the API alike."""

from __future__ import annotations

from typing import Any

from app.core.streams.flux import mass_law
from app.core.streams.model import Catalogue
from app.core.trial import assess_trial
from app.formats.trial import parse_trial


def run_trial(document: object, catalogue: Catalogue, law: str) -> dict[str, Any]:
    """Assess a trial request (JSON values) and return the answer as JSON values.

    ``law`` names a magnitude-mass-speed law. Raises ``FieldError`` naming the field to mend.
    """
    return assess_trial(parse_trial(document, catalogue), mass_law(law))
