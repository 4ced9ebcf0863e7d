"""Refusal of figures outside their range."""


def check_range(name: str, value: float, low: float, high: float) -> None:
    """Refuse `value` outside `low`..`high` (or NaN) with a message that names the field."""
    if not low <= value <= high:
        raise ValueError(f"{name} is {value:g}; it must lie between {low:g} and {high:g}")
