"""labbook: a group's bench notebook for artificial swimmers and its registry of dimensionless numbers."""

from labbook.api import Book
from labbook.errors import BookProblem, LabbookError, Refusal, Refusals, Unconfirmed

__all__ = ["Book", "BookProblem", "LabbookError", "Refusal", "Refusals", "Unconfirmed"]
