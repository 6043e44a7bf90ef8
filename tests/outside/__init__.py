"""Checks by programs that the suite does not install; see the guide for contributors for the command."""
