"""A stored request as the address of the evaluation page, and back."""

from __future__ import annotations

from service.contract.request import EvaluationRequest
from service.web.filled import form_of
from service.web.form import read_address

__all__ = ["evaluate_address", "request_of_query"]


def request_of_query(query: str) -> EvaluationRequest:
    """The request of an address of the evaluation page. Raises BadAddress, InvalidRequest."""
    return read_address(query).request()


def evaluate_address(request: EvaluationRequest) -> str | None:
    """The address that evaluates just this request; None where the form cannot hold it."""
    form = form_of(request)
    return None if form is None else f"/evaluate?{form.query()}"
