"""planar: from a band and a laminate to a tuned printed loop antenna."""

__version__ = "0.4.0"
