"""The crop terms of a day's working add up on the page, for either kind of coefficient (FAO-56)."""

from app.web.working_view import _crop


def row(kcb: float | None, ke: float | None) -> dict[str, float | None]:
    """A day of ledger figures made up for the check (regression)."""
    return {
        "eto_mm": 8.0, "kcb": kcb, "ke": ke, "ks": 0.5, "kc_actual": 0.5 if kcb is None else 0.6,
        "raw_mm": 50.0, "etc_potential_mm": 8.0, "et_actual_mm": 4.0 if kcb is None else 4.8,
    }  # fmt: skip


def test_a_single_coefficient_is_named_kc_and_leaves_no_blank_in_an_equation() -> None:
    terms = {term.name: term for term in _crop(row(None, None))}
    assert terms["crop coefficient, Kc"].value == "1.000"
    assert terms["actual coefficient"].how == "Ks Kc = 0.500 × 1.000"
    assert terms["crop ET without stress"].how == "Kc ETo = 1.000 × 8.00"
    assert terms["crop ET"].how == "0.500 × 8.00"
    assert "basal coefficient, Kcb" not in terms
    assert not any("–" in term.how for term in terms.values())


def test_dual_coefficients_keep_both_terms() -> None:
    terms = {term.name: term for term in _crop(row(0.8, 0.2))}
    assert terms["actual coefficient"].how == "Ks Kcb + Ke = 0.500 × 0.800 + 0.200"
    assert terms["crop ET without stress"].how == "(Kcb + Ke) ETo = (0.800 + 0.200) × 8.00"
