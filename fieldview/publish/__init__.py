"""Figures, tables and exported fields. No Qt."""
