"""The laser of an address, for pages beside the evaluation."""

from __future__ import annotations

from service.contract.request import EvaluationRequest
from service.web.form import Form

__all__ = ["request_of"]


def request_of(form: Form) -> EvaluationRequest:
    """The request that a form stands for. Raises InvalidRequest."""
    return form.request()
