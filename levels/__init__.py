"""Curated data and exact physics of laser-cooled atoms; knows nothing of HTTP."""
