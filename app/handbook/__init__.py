"""Published tables as data: crops, stage lengths, soils, wetting, efficiencies, runoff.

Every row carries its source; blanks stay blank. A season may override any figure.
"""

from collections.abc import Mapping
from functools import cache

from app.handbook.reader import TableError, UnknownEntryError, entry, keyed, read_rows
from app.handbook.rows import (
    ConveyanceRow,
    CropRow,
    EfficiencyRow,
    NotPublishedError,
    RunoffRow,
    SoilRow,
    StageRow,
    WetnessRow,
    WettingRow,
    WorkingStageRow,
)
from app.handbook.usable import UsableCrop, usable_crop

__all__ = [
    "ConveyanceRow",
    "CropRow",
    "EfficiencyRow",
    "NotPublishedError",
    "RunoffRow",
    "SoilRow",
    "StageRow",
    "TableError",
    "UnknownEntryError",
    "UsableCrop",
    "WetnessRow",
    "WettingRow",
    "WorkingStageRow",
    "conveyances",
    "crop",
    "crops",
    "curve_number",
    "efficiencies",
    "efficiency",
    "runoff_rows",
    "soil_texture",
    "soil_textures",
    "stage_lengths",
    "usable",
    "wetness_rows",
    "wetting",
    "wettings",
    "working_stages",
]

GROUPS = ("a", "b", "c", "d")


@cache
def crops() -> Mapping[str, CropRow]:
    """Every crop by its identifier."""
    return keyed(read_rows("crops.csv", CropRow), "crop_id", "crops.csv")


def crop(crop_id: str) -> CropRow:
    """One crop; UnknownEntryError with near matches."""
    return entry(crops(), crop_id, "crop")


@cache
def working_stages() -> Mapping[str, WorkingStageRow]:
    """Stage lengths that stand in for crops without a full printed row, by crop."""
    return keyed(read_rows("stage_working.csv", WorkingStageRow), "crop_id", "stage_working.csv")


def usable(crop_id: str, kind: str) -> UsableCrop:
    """One crop with stage lengths and "dual" or "single" coefficients, printed or, where the
    tables leave them blank, derived and marked as working values; UnknownEntryError with near
    matches."""
    return usable_crop(crop(crop_id), kind, working_stages().get(crop_id))


@cache
def soil_textures() -> Mapping[str, SoilRow]:
    """Every texture class by its identifier."""
    return keyed(read_rows("soils.csv", SoilRow), "texture_id", "soils.csv")


def soil_texture(texture_id: str) -> SoilRow:
    """One texture class; UnknownEntryError with near matches."""
    return entry(soil_textures(), texture_id, "soil texture")


@cache
def wettings() -> Mapping[str, WettingRow]:
    """Every kind of wetting by its identifier."""
    return keyed(read_rows("wetting.csv", WettingRow), "method_id", "wetting.csv")


def wetting(method_id: str) -> WettingRow:
    """One kind of wetting; UnknownEntryError with near matches."""
    return entry(wettings(), method_id, "kind of wetting")


@cache
def efficiencies() -> Mapping[str, EfficiencyRow]:
    """Every kind of application system by its identifier."""
    file = "application_efficiency.csv"
    return keyed(read_rows(file, EfficiencyRow), "method_id", file)


def efficiency(method_id: str) -> EfficiencyRow:
    """One kind of application system; UnknownEntryError with near matches."""
    return entry(efficiencies(), method_id, "application system")


@cache
def _stage_rows() -> Mapping[str, tuple[StageRow, ...]]:
    found: dict[str, list[StageRow]] = {}
    for row in read_rows("stage_lengths.csv", StageRow):
        found.setdefault(row.stage_key, []).append(row)
    return {key: tuple(rows) for key, rows in found.items()}


def stage_lengths(stage_key: str) -> tuple[StageRow, ...]:
    """Every printed row of stage lengths of one key; UnknownEntryError with near matches."""
    return entry(_stage_rows(), stage_key, "stage lengths")


@cache
def conveyances() -> Mapping[str, ConveyanceRow]:
    """Canal conveyance efficiencies by length class."""
    file = "conveyance_efficiency.csv"
    return keyed(read_rows(file, ConveyanceRow), "canal_length", file)


@cache
def runoff_rows() -> tuple[RunoffRow, ...]:
    """Every row of curve numbers."""
    return tuple(read_rows("runoff_cn.csv", RunoffRow))


@cache
def wetness_rows() -> tuple[WetnessRow, ...]:
    """Conversion of curve numbers to dry and wet soil."""
    return tuple(read_rows("runoff_arc.csv", WetnessRow))


def curve_number(cover: str, treatment: str, condition: str, group: str) -> float:
    """Average curve number of a cover, its treatment ("" for none) and hydrologic condition ("",
    poor, fair, good) on soil group A-D; UnknownEntryError with near matches."""
    letter = group.lower()
    if letter not in GROUPS:
        raise UnknownEntryError(f"no hydrologic soil group {group!r}; choose A, B, C or D")
    table = {
        " / ".join((row.cover, row.treatment, row.hydrologic_condition)): row
        for row in runoff_rows()
    }
    row = entry(table, " / ".join((cover, treatment, condition)), "curve number")
    return float(getattr(row, f"cn_{letter}"))
