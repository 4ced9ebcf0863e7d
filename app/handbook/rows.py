"""The rows of the handbook's tables; every row carries its source and its confidence: "checked"
against the text, or "memory"."""

from dataclasses import dataclass, field
from typing import Any

from app.science.soil.evaporation import rew_from_texture

# FAO-56 chapter 8: root depth of many annuals at planting, 0.15-0.20 m.
ROOT_AT_PLANTING_M = 0.2


def _within(low: float, high: float, column: str | None = None) -> Any:
    metadata: dict[str, Any] = {"low": low, "high": high}
    if column:
        metadata["column"] = column
    return field(metadata=metadata)


class NotPublishedError(LookupError):
    """A figure the cited table leaves blank; the message says what to give instead."""


@dataclass(frozen=True, kw_only=True)
class CropRow:
    """A crop's published figures; None where the cited table prints none."""

    crop_id: str
    crop_name: str
    crop_group: str
    kind: str
    stage_key: str
    stage_basis: str
    stage_ini_days: int | None = _within(0, 400)
    stage_dev_days: int | None = _within(0, 400)
    stage_mid_days: int | None = _within(0, 700)
    stage_late_days: int | None = _within(0, 400)
    stage_note: str
    stage_source: str
    stage_confidence: str
    kc_ini: float = _within(0.05, 1.5)
    kc_mid: float = _within(0.05, 1.5)
    kc_mid_low: float = _within(0.05, 1.5)
    kc_mid_high: float = _within(0.05, 1.5)
    kc_end: float = _within(0.05, 1.5)
    kc_end_low: float = _within(0.05, 1.5)
    kc_end_high: float = _within(0.05, 1.5)
    height_max_m: float = _within(0.05, 25.0)
    kc_source: str
    kc_confidence: str
    kcb_ini: float | None = _within(0.05, 1.5)
    kcb_mid: float | None = _within(0.05, 1.5)
    kcb_end: float | None = _within(0.05, 1.5)
    kcb_source: str
    kcb_confidence: str
    root_depth_low_m: float = _within(0.1, 4.0)
    root_depth_high_m: float = _within(0.1, 4.0)
    depletion_fraction: float = _within(0.05, 0.95, "depletion_fraction_p")
    root_source: str
    root_confidence: str
    ece_threshold_ds_m: float | None = _within(0.0, 12.0)
    salinity_slope_pct_per_ds_m: float | None = _within(0.0, 40.0)
    salinity_rating: str
    salinity_source: str
    salinity_confidence: str
    ky_seasonal: float | None = _within(0.1, 2.0)
    ky_source: str
    ky_confidence: str
    gdd_base_c: float | None = _within(-5.0, 20.0)
    gdd_upper_c: float | None = _within(20.0, 45.0)
    gdd_source: str
    gdd_confidence: str
    notes: str

    @property
    def perennial(self) -> bool:
        """Whether roots and height carry over from year to year."""
        return self.kind != "annual"

    @property
    def stages(self) -> tuple[int, int, int, int] | None:
        """Stage lengths [d], None where the table has no full row."""
        four = (
            self.stage_ini_days,
            self.stage_dev_days,
            self.stage_mid_days,
            self.stage_late_days,
        )
        first, second, third, fourth = four
        if first is None or second is None or third is None or fourth is None:
            return None
        return first, second, third, fourth

    @property
    def stage_days(self) -> tuple[int, int, int, int]:
        """Stage lengths [d]; NotPublishedError where the table has no full row."""
        if self.stages is None:
            raise NotPublishedError(
                f"the handbook has no full stage lengths for {self.crop_id!r}: give stage_days "
                "(initial, development, mid, late) in the season"
            )
        return self.stages

    @property
    def root_depth_min_m(self) -> float:
        """Root depth at planting [m]: 0.2 for annuals (FAO-56 chapter 8), else the greatest."""
        greatest = self.root_depth_max_m
        return greatest if self.perennial else min(ROOT_AT_PLANTING_M, greatest)

    @property
    def root_depth_max_m(self) -> float:
        """Greatest root depth [m]: the lower printed bound, which Table 22 keeps for scheduling."""
        return self.root_depth_low_m

    def coefficients(self, kind: str) -> tuple[float, float, float]:
        """Initial, mid and end coefficients, "dual" (Kcb) or "single" (Kc).

        NotPublishedError where the table has no basal ones.
        """
        if kind == "single":
            return self.kc_ini, self.kc_mid, self.kc_end
        if self.kcb_ini is None or self.kcb_mid is None or self.kcb_end is None:
            raise NotPublishedError(
                f"the handbook has no basal coefficients for {self.crop_id!r}: give kcb_ini, "
                "kcb_mid and kcb_end in the season, or choose single coefficients"
            )
        return self.kcb_ini, self.kcb_mid, self.kcb_end


@dataclass(frozen=True, kw_only=True)
class StageRow:
    """One printed row of stage lengths [d]."""

    stage_key: str
    variant: int
    default_variant: bool
    stage_ini_days: int | None = _within(0, 400)
    stage_dev_days: int | None = _within(0, 400)
    stage_mid_days: int | None = _within(0, 700)
    stage_late_days: int | None = _within(0, 400)
    planting: str
    region: str
    note: str
    source: str
    confidence: str


@dataclass(frozen=True, kw_only=True)
class WorkingStageRow:
    """Stage lengths [d] that stand in where the table prints no full row; source says of what."""

    crop_id: str
    stage_ini_days: int = _within(0, 400)
    stage_dev_days: int = _within(0, 400)
    stage_mid_days: int = _within(0, 700)
    stage_late_days: int = _within(0, 400)
    source: str
    confidence: str

    @property
    def stage_days(self) -> tuple[int, int, int, int]:
        """The four lengths [d]."""
        return (
            self.stage_ini_days,
            self.stage_dev_days,
            self.stage_mid_days,
            self.stage_late_days,
        )


@dataclass(frozen=True, kw_only=True)
class SoilRow:
    """A texture class: Table 19 mids where it lists the class, else the texture equations."""

    texture_id: str
    texture_class: str
    theta_fc_mid_m3m3: float | None = _within(0.05, 0.6)
    theta_wp_mid_m3m3: float | None = _within(0.01, 0.5)
    rew_mid_mm: float | None = _within(1.0, 15.0)
    table19_source: str
    table19_confidence: str
    sand_rep_pct: float = _within(0.0, 100.0)
    clay_rep_pct: float = _within(0.0, 100.0)
    sr_theta_wp_m3m3: float = _within(0.01, 0.5)
    sr_theta_fc_m3m3: float = _within(0.05, 0.6)
    sr_theta_sat_m3m3: float = _within(0.3, 0.7)
    sr_ksat_mm_h: float = _within(0.1, 500.0)
    sr_source: str
    sr_confidence: str

    @property
    def field_capacity(self) -> float:
        """Water content at field capacity [m3 m-3]."""
        mid = self.theta_fc_mid_m3m3
        return self.sr_theta_fc_m3m3 if mid is None else mid

    @property
    def wilting_point(self) -> float:
        """Water content at wilting point [m3 m-3]."""
        mid = self.theta_wp_mid_m3m3
        return self.sr_theta_wp_m3m3 if mid is None else mid

    @property
    def saturation(self) -> float:
        """Water content at saturation [m3 m-3]."""
        return self.sr_theta_sat_m3m3

    @property
    def rew_mm(self) -> float:
        """Readily evaporable water [mm]: Table 19, else from sand and clay."""
        if self.rew_mid_mm is not None:
            return self.rew_mid_mm
        return float(rew_from_texture(self.sand_rep_pct, self.clay_rep_pct))

    @property
    def source(self) -> str:
        """Where the water contents come from."""
        return self.table19_source or self.sr_source

    @property
    def confidence(self) -> str:
        """How the source was seen."""
        return self.table19_confidence or self.sr_confidence


@dataclass(frozen=True, kw_only=True)
class WettingRow:
    """Fraction of the surface a kind of wetting wets."""

    method_id: str
    wetting_event: str
    fw_min: float = _within(0.01, 1.0)
    fw_max: float = _within(0.01, 1.0)
    fw_mid: float = _within(0.01, 1.0)
    note: str
    source: str
    confidence: str


@dataclass(frozen=True, kw_only=True)
class EfficiencyRow:
    """Field application efficiency [%] of a kind of system."""

    method_id: str
    system: str
    method: str
    attainable_pct: float | None = _within(20.0, 100.0)
    range_low_pct: float | None = _within(20.0, 100.0)
    range_high_pct: float | None = _within(20.0, 100.0)
    average_pct: float = _within(20.0, 100.0)
    meaning: str
    source: str
    confidence: str

    @property
    def efficiency(self) -> float:
        """Average application efficiency, 0-1."""
        return self.average_pct / 100.0


@dataclass(frozen=True, kw_only=True)
class ConveyanceRow:
    """Conveyance efficiency [%] of canals of one length class."""

    canal_length: str
    length_range: str
    earthen_sand_pct: float = _within(20.0, 100.0)
    earthen_loam_pct: float = _within(20.0, 100.0)
    earthen_clay_pct: float = _within(20.0, 100.0)
    lined_pct: float = _within(20.0, 100.0)
    source: str
    confidence: str


@dataclass(frozen=True, kw_only=True)
class RunoffRow:
    """Curve numbers of a cover by hydrologic soil group, average wetness."""

    cover: str
    treatment: str
    hydrologic_condition: str
    cn_a: float = _within(1.0, 100.0)
    cn_b: float = _within(1.0, 100.0)
    cn_c: float = _within(1.0, 100.0)
    cn_d: float = _within(1.0, 100.0)
    source: str
    confidence: str


@dataclass(frozen=True, kw_only=True)
class WetnessRow:
    """Curve numbers of dry and wet soil for an average one."""

    cn_average: float = _within(0.0, 100.0, "cn_arc2")
    cn_dry: float = _within(0.0, 100.0, "cn_arc1_dry")
    cn_wet: float = _within(0.0, 100.0, "cn_arc3_wet")
    source: str
    confidence: str
