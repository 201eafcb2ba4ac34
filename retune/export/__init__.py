"""Exporter plug-ins: bytes from tuned scores."""
