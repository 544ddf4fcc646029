"""The command line: ``twlocate COMMAND``; each command is one thin file in ``commands/``."""

import click

from twlocate.commands.inspect import inspect
from twlocate.commands.locate import locate


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="twlocate")
def main() -> None:
    """Place a fault or a leak on a line, cable or pipe from recorded transients."""


main.add_command(inspect)
main.add_command(locate)

if __name__ == "__main__":
    main()
