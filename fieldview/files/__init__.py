"""Readers and writers, one module per format, and the run of frames they make."""
