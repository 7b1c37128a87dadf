"""The link's standing follows from its echo alone."""

from itertools import pairwise

from hypothesis import given
from hypothesis import strategies as st

from gateway.link.echo import Echo, Returned, Standing
from gateway.link.options import SECOND, Patience

P = Patience()
S = SECOND


def echo(t: int = 0) -> Echo:
    """Make the echo of a connection that was made at `t`."""
    return Echo(P, "inst", "conn", t)


def test_a_new_connection_proves_nothing() -> None:
    """Until the first token is back, whatever comes may be of any age and the link is catching up."""
    fresh = echo()
    fresh.heard(1 * S)
    assert fresh.bound(1 * S) is None
    assert fresh.late(1 * S)
    assert fresh.standing(1 * S) is Standing.CATCHING_UP


def test_the_bound_is_the_age_of_the_newest_returned_token() -> None:
    """B(t) = t - sending time of the newest token that is back, and it grows with t."""
    e = echo()
    token = e.token(1 * S)
    assert e.returned(token) is Returned.OURS
    assert e.bound(4 * S) == 3 * S
    assert not e.late(9 * S)
    assert e.late(9 * S + 1)


def test_tokens_go_out_every_three_seconds() -> None:
    """The next is due `echo_every` after the last, the first at once."""
    e = echo(5 * S)
    assert e.next_send == 5 * S
    e.token(6 * S)
    assert e.next_send == 6 * S + P.echo_every


def test_an_overdue_token_ends_the_proof_and_its_return_restores_it() -> None:
    """Overdue is catching up while other things arrive, and proven again as soon as a newer one is back."""
    e = echo()
    e.returned(e.token(0))
    lost = e.token(3 * S)
    e.heard(8 * S)
    assert e.standing(8 * S) is Standing.PROVEN
    assert e.standing(8 * S + 1) is Standing.CATCHING_UP
    newer = e.token(9 * S)
    assert e.returned(newer) is Returned.OURS
    e.heard(9 * S)
    assert e.standing(9 * S) is Standing.PROVEN
    assert e.returned(lost) is Returned.EARLIER  # it was given up; an older one never lowers the bound
    assert e.bound(9 * S) == 0


def test_silence_is_down_and_anything_heard_is_not() -> None:
    """Nothing at all for more than five seconds is down, whatever the tokens say."""
    e = echo()
    e.returned(e.token(0))
    assert e.standing(5 * S) is Standing.PROVEN
    assert e.standing(5 * S + 1) is Standing.DOWN
    e.heard(5 * S + 1)
    assert e.standing(5 * S + 1) is Standing.PROVEN


def test_catching_up_is_given_up_after_a_minute() -> None:
    """While messages arrive without the echo, the link waits for sixty seconds and not more."""
    e = echo()
    for t in range(61):
        e.heard(t * S)
        assert e.standing(t * S) is Standing.CATCHING_UP
    e.heard(60 * S + 1)
    assert e.standing(60 * S + 1) is Standing.GIVE_UP


def test_the_minute_begins_anew_when_the_link_was_proven_in_between() -> None:
    """Only time spent behind counts."""
    e = echo()
    e.heard(50 * S)
    assert e.standing(50 * S) is Standing.CATCHING_UP
    e.returned(e.token(50 * S))
    assert e.standing(50 * S) is Standing.PROVEN
    e.heard(100 * S)
    assert e.standing(100 * S) is Standing.CATCHING_UP
    e.heard(160 * S)
    assert e.standing(160 * S) is Standing.CATCHING_UP


def test_after_a_stall_only_a_token_sent_since_counts() -> None:
    """A token from before the stall has waited unread with everything else, so it proves nothing."""
    e = echo()
    e.returned(e.token(0))
    before = e.token(3 * S)
    e.stalled(20 * S)
    assert e.bound(20 * S) is None
    assert e.standing(20 * S) is Standing.CATCHING_UP
    assert e.next_send == 20 * S
    assert e.returned(before) is Returned.EARLIER
    assert e.late(20 * S)
    assert e.returned(e.token(20 * S)) is Returned.OURS
    assert e.standing(20 * S) is Standing.PROVEN


def test_tokens_of_others_and_of_earlier_connections_prove_nothing() -> None:
    """Another gateway's token is foreign; our own of another connection, and garbage, say nothing."""
    e = echo()
    e.token(0)
    assert e.returned(b"other conn 1") is Returned.FOREIGN
    assert e.returned(b"inst before 1") is Returned.EARLIER
    assert e.returned(b"") is Returned.EARLIER
    assert e.returned(b"\xff\x00 garbage") is Returned.EARLIER
    assert e.returned(b"inst conn 2") is Returned.EARLIER
    assert e.returned(b"inst conn 1x") is Returned.EARLIER
    assert e.bound(0) is None


@given(st.lists(st.tuples(st.integers(0, 4 * S), st.sampled_from(["send", "return", "hear", "stall"])), max_size=60))
def test_proven_means_a_recent_return(acts: list[tuple[int, str]]) -> None:
    """Whatever happens: proven implies a token of this connection, at most eight seconds old, after any stall."""
    e, t, sent, newest = echo(), 0, list[tuple[int, bytes]](), None
    for wait, act in acts:
        t += wait
        if act == "send":
            sent.append((t, e.token(t)))
        elif act == "return" and sent:
            at, token = sent.pop(0)
            e.heard(t)
            newest = at if e.returned(token) is Returned.OURS else newest
        elif act == "hear":
            e.heard(t)
        elif act == "stall":
            e.stalled(t)
            sent.clear()
            newest = None
        if e.standing(t) is Standing.PROVEN:
            assert newest is not None
            assert t - newest <= P.live_within
        assert e.late(t) == (newest is None or t - newest > P.live_within)


@given(st.lists(st.integers(0, 10 * S), min_size=2))
def test_the_bound_never_falls_by_itself(steps: list[int]) -> None:
    """Between returns the bound grows exactly as time does."""
    e, t = echo(), 0
    e.returned(e.token(0))
    bounds = []
    for step in steps:
        t += step
        bounds.append(e.bound(t))
    for (earlier, later), step in zip(pairwise(bounds), steps[1:], strict=True):
        assert earlier is not None
        assert later == earlier + step
