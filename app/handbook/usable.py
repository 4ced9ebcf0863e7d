"""Figures that make every crop usable by name: as printed, else derived, and each said to be so."""

from dataclasses import dataclass

from app.handbook.rows import CropRow, WorkingStageRow
from app.science.crop.basal import basal_from_single


@dataclass(frozen=True)
class UsableCrop:
    """A crop's stage lengths [d] and coefficients of one kind; `stages_source` and
    `coefficients_source` say where each is from, `working` whether any is not printed."""

    row: CropRow
    stage_days: tuple[int, int, int, int]
    coefficients: tuple[float, float, float]
    stages_source: str
    coefficients_source: str
    working: bool


def usable_crop(row: CropRow, kind: str, stand_in: WorkingStageRow | None) -> UsableCrop:
    """`row` with what it leaves blank filled in.

    kind: "dual" or "single". stand_in: stage lengths where the table has no full row. Basal
    coefficients the table leaves blank follow from the single ones (FAO-56 Table 18).
    """
    stages, stages_source = row.stages, row.stage_source
    if stages is None and stand_in is not None:
        stages, stages_source = stand_in.stage_days, stand_in.source
    derived = kind == "dual" and None in (row.kcb_ini, row.kcb_mid, row.kcb_end)
    if derived:
        k = basal_from_single(row.kc_ini, row.kc_mid, row.kc_end, dense=True, annual=False)
        source = "from the single coefficients by FAO-56 Table 18 (working value)"
    else:
        k = row.coefficients(kind)
        source = row.kc_source if kind == "single" else row.kcb_source
    return UsableCrop(
        row=row,
        stage_days=row.stage_days if stages is None else stages,
        coefficients=k,
        stages_source=stages_source,
        coefficients_source=source,
        working=derived or row.stages is None,
    )
