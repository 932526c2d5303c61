"""Blinkline: laser hazard evaluation as a web service."""

__version__ = "0.1.0"
