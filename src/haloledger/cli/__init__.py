"""The command line: one module a command, each a coat over the public Python functions."""


def main() -> None:
    """Entry point of `haloledger`."""
    from haloledger.cli.group import cli

    cli(prog_name="haloledger")
