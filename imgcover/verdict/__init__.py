"""Declared against measured: conformity with uncertainty, lots, and what must be wrong."""
