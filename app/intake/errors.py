"""The one error of the intake room."""


class IntakeError(Exception):
    """A file or a mapping that cannot be used; the message says what is wrong and what to do."""
