"""Accuracy and speed measured beside other routines; each module is run by `python -m benchmarks.<name>`."""
