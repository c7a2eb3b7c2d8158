"""Comparing one measured ring with scans of scenes: θ_g, mass, error budget, cautions."""

from __future__ import annotations

from ringwright.comparing.answering import compare
from ringwright.comparing.results import Comparison, Estimate
from ringwright.comparing.wording import summary

__all__ = ["Comparison", "Estimate", "compare", "summary"]
