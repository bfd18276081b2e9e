"""Exact, reproducible probability statements for digital investment advice."""

__version__ = "0.1.0"
