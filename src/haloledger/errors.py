"""The errors a user can meet. Each message names what was found and ends with the next step."""


class HaloledgerError(Exception):
    """Anything this package raises on purpose."""


class InputError(HaloledgerError):
    """Bad input: nothing has been written. The message says where, what was found and what to write instead."""
