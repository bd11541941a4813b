"""Codes on disk: every word has one, none changes."""

from ginnel.store import codes
from ginnel.words import Direction, Flag, MoverKind, Story


def test_every_word_has_its_own_code() -> None:
    for words, table in (
        (Story, codes.STORY_CODES),
        (Direction, codes.DIRECTION_CODES),
        (MoverKind, codes.MOVER_CODES),
        (Flag, codes.FLAG_BITS),
    ):
        assert set(table) == set(words)
        assert len(set(table.values())) == len(table)
    assert all(bit & (bit - 1) == 0 for bit in codes.FLAG_BITS.values())


def test_codes_that_lie_on_disks_stay_what_they_were() -> None:
    # fixed by the first published store; a change would misread every log there is
    assert {word.value: code for word, code in codes.STORY_CODES.items()} == {
        "passage": 0,
        "turn-back": 1,
        "fidget": 2,
    }
    assert codes.DIRECTION_CODES[Direction.UNKNOWN] == 0
    assert codes.DIRECTION_CODES[Direction.APPROACHING] == 1
    assert codes.DIRECTION_CODES[Direction.RECEDING] == 2
    assert [codes.FLAG_BITS[Flag(name)] for name in ("clipped", "cut", "overlapping", "low-confidence")] == [
        1,
        2,
        4,
        8,
    ]
