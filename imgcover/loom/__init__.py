"""Draws cloth with known truth: yarn, cloth, camera; for samples, planning and tests."""
