"""Basal coefficients from single ones, for crops whose table prints none."""

# FAO-56 Table 18: Kcb ini of bare soil under an annual.
BARE_ANNUAL = 0.15
# FAO-56 Table 18: what evaporation adds to Kcb: in a dense stand (cover above 80 %) or one whose
# surface is dry at the end, and otherwise.
LITTLE, MUCH = 0.05, 0.10


def basal_from_single(
    kc_ini: float,
    kc_mid: float,
    kc_end: float,
    *,
    dense: bool = True,
    wet_end: bool = False,
    annual: bool = True,
) -> tuple[float, float, float]:
    """Kcb ini, mid and end from Kc ini, mid and end [-], never below 0.

    dense: covers more than 80 % of the ground at mid-season; wet_end: the surface is wetted often
    in the late stage; annual: bare ground at planting, else Kcb ini is 0.10 below Kc ini (forage,
    FAO-56 Table 17 beside Table 12). NaN in, NaN out. Source: FAO-56 Table 18.
    """
    ini = BARE_ANNUAL + 0.0 * kc_ini if annual else max(kc_ini - MUCH, 0.0 * kc_ini)
    mid = kc_mid - (LITTLE if dense else MUCH)
    end = kc_end - (MUCH if wet_end else LITTLE)
    return ini, max(mid, 0.0 * mid), max(end, 0.0 * end)
