"""One comparator: its datasheet judged, and later its devices, bench and sizing."""
