"""What-if assessments; nothing is stored."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.responses import Response

from app.api import docs
from app.api.bodies import JsonBody
from app.api.caching import json_response
from app.api.deps import AskedNow
from app.api.schemas import TrialOut
from app.core.advice.advisory import CAUTION
from app.errors import FieldError, OrbitError

router = APIRouter(prefix="/v1/trials", tags=["trials"])


@router.post(
    "",
    response_model=TrialOut,
    responses=docs.writing("trial", 200, *docs.BODY_ERRORS, text="The assessment."),
    openapi_extra=docs.body("TrialIn", "trial request"),
)
def try_attitude(asked: AskedNow, document: JsonBody) -> Response:
    """Assess an attitude, faces and streams of your own at given states, or along an orbit."""
    context = asked.context
    try:
        result = context.computations.trial(document, context.catalogue, context.settings.mass_law)
    except OrbitError as error:  # here the orbit is part of the request
        raise FieldError("orbit", error.detail) from None
    return json_response({**result, "caution": CAUTION})
