"""Choosing n: precision, coverage that holds at every larger n, rare outcomes, and a claim about a goal."""

from coverage_lab.sizing.answer import size
from coverage_lab.sizing.formula import ladder, margin_of_error, wilson_size
from coverage_lab.sizing.pool import Interrupted

__all__ = ["Interrupted", "ladder", "margin_of_error", "size", "wilson_size"]
