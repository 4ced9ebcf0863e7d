"""Codes that stand for a missing value, as texts and as figures."""

import numpy as np

from app.intake.model import Floats, Mapping
from app.science.quantities import QUANTITIES
from app.units import to_si


def blank_codes(values: Floats, missing: tuple[str, ...]) -> None:
    """Missing codes written another way (-9999.00) become NaN, in place."""
    if values.size == 0 or np.isnan(values).all():
        return
    low, high = np.nanmin(values), np.nanmax(values)
    for code in _codes(missing):
        if low <= code <= high:
            values[values == code] = np.nan


def _codes(missing: tuple[str, ...]) -> list[float]:
    codes = []
    for text in missing:
        try:
            code = float(text)
        except ValueError:
            continue
        if np.isfinite(code):
            codes.append(code)
    return codes


def missing_for(mapping: Mapping, position: int) -> tuple[str, ...]:
    """The missing codes of one column: a figure the column may well read is none (9999 Wh/m2)."""
    column = mapping.column(position)
    if column is None or column.quantity is None or column.unit is None:
        return tuple(mapping.missing)
    limits = QUANTITIES[column.quantity]
    kept = []
    for text in mapping.missing:
        codes = _codes((text,))
        if codes and abs(codes[0]) > 1000:
            value = to_si(codes[0], column.unit, column.quantity, mapping.interval_s or 3600)
            if limits.low <= float(value) <= limits.high:
                continue
        kept.append(text)
    return tuple(kept)
