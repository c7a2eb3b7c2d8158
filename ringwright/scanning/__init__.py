"""Scans: many scenes drawn from a declared prior, each with its table of ring readings."""

from __future__ import annotations

from typing import Any

__all__ = ["ScanTable", "scan"]


def __getattr__(name: str) -> Any:
    if name == "scan":
        from ringwright.scanning.running import scan

        return scan
    if name == "ScanTable":
        from ringwright.scanning.table import ScanTable

        return ScanTable
    raise AttributeError(f"module 'ringwright.scanning' has no attribute '{name}'")
