"""Captured codes: read, measured, and explained against the plan."""
