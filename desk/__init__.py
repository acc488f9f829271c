"""Gapwright: what promised payments are worth, and whether the assets held will meet them."""

__version__ = "0.1.0"
