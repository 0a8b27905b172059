"""Random numbers of a verify: no two reads of one verify share a draw, however many there are."""

from programming.reading import _SHARED_DRAW, sub_draw


def test_reads_share_no_draw():
    """A read's normal may take second looks at sub-draws 64 apart (one in a hundred does); sixty in a row never happen."""
    most_reads = 100_000  # as many as a scenario may ask for
    firsts = [sub_draw(read) for read in range(most_reads)]
    assert firsts[:64] == list(range(64))
    assert len(set(firsts)) == most_reads
    assert max(firsts) + 60 * 64 < _SHARED_DRAW < 1 << 24
    blocks = {draw // 4096 for draw in firsts}
    assert all(draw % 4096 < 64 for draw in firsts)  # second looks stay in the read's own block of 4096, at its own place
    assert len(blocks) == -(-most_reads // 64)
