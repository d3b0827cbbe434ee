"""Limits, cancelling, and a record that only ever improves."""

from __future__ import annotations

from hubdesign.answer import Progress
from hubdesign.solve.control import Control


def test_the_record_of_a_minimised_goal_only_improves() -> None:
    heard: list[Progress] = []
    control = Control(gap=0.1, listener=heard.append)
    for best, bound in ((None, 5.0), (20.0, None), (25.0, None), (None, 4.0), (10.0, 9.5)):
        control.report(best=best, bound=bound)
    assert [(p.best, p.bound) for p in control.record] == [(None, 5.0), (20.0, 5.0), (10.0, 9.5)]
    assert heard == list(control.record)
    assert control.gap_reached()


def test_the_record_of_a_maximised_goal_only_improves() -> None:
    control = Control(maximise=True)
    for best, bound in ((1.0, 9.0), (0.5, 8.0), (2.0, 8.5)):
        control.report(best=best, bound=bound)
    assert [(p.best, p.bound) for p in control.record] == [(1.0, 9.0), (1.0, 8.0), (2.0, 8.0)]
    assert not control.gap_reached()


def test_cancelling_stops_every_part_and_calls_interrupters() -> None:
    control = Control(time_limit_s=1000.0)
    step = control.part(500.0)
    called: list[str] = []
    with step.interrupting(lambda: called.append("solver")):
        control.cancel()
    assert called == ["solver"]
    assert step.stop_requested()
    assert step.remaining_s() == 0.0


def test_a_part_never_outlives_the_whole() -> None:
    control = Control(time_limit_s=0.0)
    assert control.part(100.0).stop_requested()
