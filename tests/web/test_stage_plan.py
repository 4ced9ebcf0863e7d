"""A deficit plan typed into the season's form reaches the advice and says why."""

from tests.web.conftest import Browser

SEASON = {"was": "2026-04-20", "planting": "2026-04-20", "crop": "maize_grain"}


def test_a_plan_by_stage_sets_the_depth_and_is_told(live: Browser) -> None:
    url = "/api/v1/fields/long-piece/advice"
    (before,) = live.get(url).json()
    form = {**SEASON, "refill_to_by_stage": "10 10 10 10", "et_target_by_stage": "70 70 70 70"}
    answer = live.post("/fields/long-piece/seasons", data=form)
    assert answer.status_code in (200, 303), answer.text
    (after,) = live.get(url).json()
    assert after["number"] != before["number"]
    assert set(after["outlook"]["target"]) == {0.7}
    assert "70 70 70 70" in live.get("/fields/long-piece/seasons?planting=2026-04-20").text
    if after["day"] is not None:
        page = live.get("/fields/long-piece").text
        assert "By its stage’s plan 70 % of the crop’s use is given back" in page.replace(
            "\u202f", " "
        ).replace("\u00a0", " ")


def test_a_plan_that_leaves_more_than_the_limit_is_refused(live: Browser) -> None:
    form = {**SEASON, "mad": "40", "refill_to_by_stage": "- - 50 -"}
    answer = live.post("/fields/long-piece/seasons", data=form)
    assert answer.status_code == 422
    assert "below that stage" in answer.text.replace("&#39;", "'")
    form = {**SEASON, "et_target_by_stage": "- - 0 -"}
    assert live.post("/fields/long-piece/seasons", data=form).status_code == 422
