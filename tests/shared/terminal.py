"""The command line as tests use it: one command, its exit code, no traceback."""

from click.testing import CliRunner

from labbook.cli import main


def run(*words, code=0):
    """The finished command; its exit code must be the one given, and no traceback may show."""
    done = CliRunner().invoke(main, [str(w) for w in words])
    assert done.exception is None or isinstance(done.exception, SystemExit), done.exception
    assert done.exit_code == code, (done.stdout, done.stderr)
    return done
