"""Coincident demand of metered customers, and the transformer rating it asks for."""

__version__ = "0.1.0"
