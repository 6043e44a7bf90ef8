"""Sheets on the whole run, each filled in the background: check, time, statistics, modes, choices."""
