"""Pixels to millimetres: stated pitch, metadata, a rule, a printed sheet, a certificate."""
