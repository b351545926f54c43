"""Plainlight: explain odd stars away, together and with numbers, or say that nothing did."""

__version__ = "0.1.0"
