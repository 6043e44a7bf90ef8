"""The window. Shows the session, edits the session, computes nothing."""
