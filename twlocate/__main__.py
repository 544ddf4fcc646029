"""The command line: ``twlocate COMMAND``; each command is one thin file in ``commands/``."""

import os

import click

from twlocate.commands.inspect import inspect
from twlocate.commands.locate import locate
from twlocate.commands.simulate import simulate
from twlocate.commands.speed import speed
from twlocate.commands.validate import validate

# The matrices here are small: more threads cost more than they save, and with one the last bits of a sum do not
# depend on the machine, so that the same inputs give the same bytes.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="twlocate")
def main() -> None:
    """Place a fault or a leak on a line, cable or pipe from recorded transients."""


main.add_command(inspect)
main.add_command(locate)
main.add_command(simulate)
main.add_command(speed)
main.add_command(validate)

if __name__ == "__main__":
    main()
