"""Proves and draws superposed print screens."""

__version__ = "0.1.0"
