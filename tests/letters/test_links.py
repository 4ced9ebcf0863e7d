"""Signed links: what is forged or has run out does not count."""

from datetime import date

import pytest
from hypothesis import given
from hypothesis import strategies as some

from app.letters.links import LinkError, read, sign

KEY, TODAY = b"k" * 32, date(2026, 7, 13)


def test_a_link_says_what_was_signed_until_its_day() -> None:
    token = sign(KEY, "done", 7, 3, until=TODAY)
    assert read(KEY, "done", token, TODAY) == ["7", "3"]
    with pytest.raises(LinkError) as late:
        read(KEY, "done", token, date(2026, 7, 14))
    assert late.value.expired
    with pytest.raises(LinkError) as other:
        read(KEY, "stop", token, TODAY)
    assert not other.value.expired
    with pytest.raises(LinkError):
        read(b"x" * 32, "done", token, TODAY)
    assert read(KEY, "stop", sign(KEY, "stop", 1), date(2200, 1, 1)) == ["1"]


@given(some.text(max_size=80))
def test_what_is_made_up_does_not_count(text: str) -> None:
    for token in (text, f"done.7.3.20990101.{text}", f"{text}.{sign(KEY, 'done', 7)}"):
        with pytest.raises(LinkError):
            read(KEY, "done", token, TODAY)


@given(some.integers(0, 40), some.characters(codec="ascii"))
def test_a_changed_letter_of_a_token_breaks_it(place: int, sign_: str) -> None:
    token = sign(KEY, "done", 7, 3, until=TODAY)
    place %= len(token)
    if token[place] != sign_:
        with pytest.raises(LinkError):
            read(KEY, "done", token[:place] + sign_ + token[place + 1 :], TODAY)
