"""The one error a user can cause."""


class InputError(ValueError):
    """What came in cannot be used: one plain sentence naming what (file, line, argument) and the remedy.

    The command line prints it and exits with status 2; the window shows it in its banner.
    """
