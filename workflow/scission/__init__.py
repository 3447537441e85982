"""Bond scans by quantum chemistry: one campaign file to curves, diagnostics, flags and tables."""

__version__ = "0.1.0"
