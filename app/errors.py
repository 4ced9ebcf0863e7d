"""What every room raises when something given to it cannot be used."""


class InputError(Exception):
    """Bad input; the message names what is wrong, where, and what to do about it."""
