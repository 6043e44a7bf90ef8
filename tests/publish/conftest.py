"""The command, called in this process."""

import pytest

from fieldview import cli


@pytest.fixture
def run(capfd):
    """Call ``loopflux`` with these arguments: exit status, standard output, standard error."""

    def call(*arguments) -> tuple[int, str, str]:
        status = cli.run([str(argument) for argument in arguments])
        return status, *capfd.readouterr()

    return call
