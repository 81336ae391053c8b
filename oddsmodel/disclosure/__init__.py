"""What may leave: hides small counts and what would give them away, and makes figures coarse."""

from oddsmodel.disclosure.disclose import disclose

__all__ = ["disclose"]
