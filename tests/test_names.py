"""Names and found text in messages."""

import pytest

from tcplan.names import nearest_name, shown


@pytest.mark.parametrize(
    ("found", "nearest"),
    [
        ("automotive1", "automotive-1"),
        ("MILITARY", "military"),
        ("militray", "military"),
        ("zzz", None),
        ("", None),
        ("military" * 1000, None),
    ],
)
def test_nearest_name(found: str, nearest: str | None) -> None:
    assert nearest_name(found, ("automotive-1", "military")) == nearest


def test_nearest_name_of_none_known() -> None:
    assert nearest_name("military", ()) is None


def test_shown_leaves_short_text_readable() -> None:
    assert shown("12 kohm") == "'12 kohm'"
    assert shown(12) == "12"


@pytest.mark.parametrize("text", ["x" * 10**6, list(range(1000)), 10**5000, "\x1b" * 100], ids=range(4))
@pytest.mark.parametrize("limit", [5, 20, 60])
def test_shown_is_short(text: object, limit: int) -> None:
    assert 0 < len(shown(text, limit)) <= limit


class _Loud:
    def __repr__(self) -> str:
        return "\x1b[31mred\n\u202e"


@pytest.mark.parametrize("text", ["\x1b[31mred\n\u202e", "\x00\x07\r\t", _Loud(), ["\x1b[0m"]])
def test_shown_has_no_control_characters(text: object) -> None:
    assert shown(text).isprintable()


def test_shown_marks_a_cut() -> None:
    assert shown("x" * 61).endswith("...")
    assert not shown("x" * 58).endswith("...")
