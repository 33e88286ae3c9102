"""Evaluating stored designs again with another evaluator."""

from studies.verification.all import Plans, plans, verify_all
from studies.verification.selection import read_settings

__all__ = ["Plans", "plans", "read_settings", "verify_all"]
