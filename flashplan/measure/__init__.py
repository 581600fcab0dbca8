"""Captured codes: read, measured, and explained against the plan."""

from flashplan.measure.capture import Capture, read_capture
from flashplan.measure.diagnose import Finding
from flashplan.measure.measure import MeasureResult, measure_capture

__all__ = ["Capture", "Finding", "MeasureResult", "measure_capture", "read_capture"]
