"""The one error of the intake room."""

from app.errors import InputError


class IntakeError(InputError):
    """A file or a mapping that cannot be used; the message says what is wrong and what to do."""
