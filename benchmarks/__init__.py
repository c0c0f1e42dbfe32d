"""Measurements: ``python -m benchmarks``; see README.md."""
