"""Scans: many scenes drawn from a declared prior, each with its table of ring readings."""
