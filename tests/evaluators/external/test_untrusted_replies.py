"""Replies of any content: a checked reply or one clear sentence, never anything else."""

from __future__ import annotations

import json
import math
from typing import Any

import machines
import numpy as np
import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from evaluators.external.evaluator import ExternalEvaluator
from evaluators.external.quantities import FIELD
from evaluators.external.reply import FORMAT, Reply, ReplyError, read_reply
from evaluators.external.wording import LONGEST_REASON
from evaluators.interface import Status
from evaluators.machine.field import excitation

METRICS = ("cost", "insulation_margin_K")
QUICK, LONG = 150, 4000

words = st.text(max_size=30) | st.sampled_from(
    ["=1+1", "@SUM(A1)", "<script>alert(1)</script>", "../../etc/passwd", "\x1b[31m", "\ud800"]
)
numbers = (
    st.floats()
    | st.integers(-(10**400), 10**400)
    | st.sampled_from([0, -0.0, 1e999, 5e-324, 2**53 + 1, True])
)
values = st.recursive(
    st.none() | numbers | words,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(words, inner, max_size=3),
    max_leaves=6,
)


def right_reply() -> dict[str, Any]:
    within = {item.key: 0.5 * min(item.highest, 2.0) for item in FIELD}
    return {
        "format": FORMAT,
        "format_version": 1,
        "status": "ok",
        "field": within,
        "metrics": {"cost": 1.0, "insulation_margin_K": -5.0},
    }


@st.composite
def changed_replies(draw: st.DrawFn) -> bytes:
    """A right reply with some values replaced, taken out or added, somewhere."""
    table = right_reply()
    for _ in range(draw(st.integers(0, 3))):
        place = draw(st.sampled_from([table, table.get("field"), table.get("metrics")]))
        if not isinstance(place, dict):
            continue
        key = (
            draw(st.sampled_from(sorted(place)) if place else words)
            if draw(st.booleans())
            else draw(words)
        )
        if draw(st.booleans()):
            place.pop(key, None)
        else:
            place[key] = draw(values)
    text = json.dumps(table)
    if draw(st.integers(0, 9)) == 0:
        cut = draw(st.integers(0, len(text)))
        return text[:cut].encode() + draw(st.binary(max_size=20))
    return text.encode()


def check(content: bytes, field: bool) -> None:
    try:
        reply = read_reply(content, field, METRICS)
    except ReplyError as error:
        text = str(error)
        assert text
        text.encode()
        assert text.isprintable()
        assert len(text) <= LONGEST_REASON
        return
    assert isinstance(reply, Reply)
    if reply.reason:
        assert reply.reason.isprintable()
        return
    assert set(reply.metrics) == set(METRICS)
    assert len(reply.field) == (len(FIELD) if field else 0)
    for value in (*reply.field.values(), *reply.metrics.values()):
        assert type(value) is float
        assert math.isfinite(value)
    assert reply.metrics["cost"] >= 0.0


def test_the_right_reply_is_right() -> None:
    check(json.dumps(right_reply()).encode(), True)
    assert not read_reply(json.dumps(right_reply()).encode(), True, METRICS).reason


@settings(max_examples=QUICK, deadline=None)
@given(changed_replies(), st.booleans())
@example(b"[" * 100_000, True)
@example(b"9" * 10_000, False)
@example(b'{"a": ' * 5000, True)
def test_changed_replies(content: bytes, field: bool) -> None:
    check(content, field)


@settings(max_examples=QUICK, deadline=None)
@given(st.binary(max_size=200) | values.map(lambda item: json.dumps(item).encode()))
def test_any_bytes(content: bytes) -> None:
    check(content, True)


@pytest.mark.slow
@settings(max_examples=LONG, deadline=None, suppress_health_check=list(HealthCheck))
@given(changed_replies() | st.binary(max_size=500), st.booleans())
def test_many_replies(content: bytes, field: bool) -> None:
    check(content, field)


def in_range(low: float, high: float) -> st.SearchStrategy[float]:
    usual = [value for value in (0.0, 1e-6, 0.5, 20.0, 1e3) if low <= value <= high]
    return st.floats(low, high) | st.sampled_from([low, high, *usual])


class Answering(ExternalEvaluator):
    """The evaluator with replies of the test's own instead of a program's."""

    answers: list[Reply]

    def _reply(self, *arguments: object) -> Reply:  # type: ignore[override]
        return self.answers.pop(0)


def check_fields(fields: list[dict[str, float]]) -> None:
    evaluator = Answering(machines.task(), {"program": ["true"]})
    evaluator.allow_program()
    batch = machines.designs(len(fields) + 1)
    usual = {
        item.attribute: item.factor * min(max(value, item.lowest), item.highest)
        for item, value in zip(FIELD, USUAL, strict=True)
    }
    evaluator.answers = [Reply("", field, {}) for field in [*fields, usual]]
    result = evaluator.evaluate(batch)
    # Whatever the other rows hold, the usual one comes out well.
    assert result.status[-1] == Status.OK, result.reason[-1]
    for row, status in enumerate(result.status.tolist()):
        column = np.array([metric[row] for metric in result.metrics.values()])
        assert status in (Status.OK.value, Status.FAILED.value)
        assert np.isfinite(column).all() == (status == Status.OK.value)
        assert bool(result.reason[row]) == (status != Status.OK.value)
        assert result.reason[row].isprintable()


# An invented machine, in the order of FIELD.
USUAL = (26.0, 0.04, 1.0, 118.0, 0.01, 0.5, 5.5, 2e6, 0.0226, 3e-5, 2.4e-5, 0.63, 1.1, 1.2, 0.2,
         0.12, 2300.0, 2100.0, 220.0, 1.0)  # fmt: skip
any_field = st.fixed_dictionaries(
    {
        item.attribute: in_range(item.lowest, item.highest).map(
            lambda value, factor=item.factor: value * factor
        )
        for item in FIELD
    }
)


@settings(max_examples=40, deadline=None)
@given(st.lists(any_field, min_size=1, max_size=4))
def test_any_field_within_its_ranges_makes_rows(fields: list[dict[str, float]]) -> None:
    check_fields(fields)


@pytest.mark.slow
@settings(max_examples=1500, deadline=None, suppress_health_check=list(HealthCheck))
@given(st.lists(any_field, min_size=1, max_size=6))
def test_many_fields_within_their_ranges(fields: list[dict[str, float]]) -> None:
    check_fields(fields)


def test_field_quantities_reach_their_metrics() -> None:
    table = right_reply()
    table["field"] = dict(zip((item.key for item in FIELD), USUAL, strict=True))
    evaluator = Answering(machines.task(), {"program": ["true"], "metrics": list(METRICS)})
    evaluator.allow_program()
    evaluator.answers = [read_reply(json.dumps(table).encode(), True, METRICS)]
    found = {
        name: column[0] for name, column in evaluator.evaluate(machines.designs()).metrics.items()
    }
    # Those that neither length nor temperature change stand as they were sent: rounding of the
    # change from degrees to radians and back.
    same = {
        "torque_ripple": "torque_ripple",
        "force_error_magnitude": "force_error_magnitude",
        "force_error_angle_deg": "force_error_angle_deg",
    }
    for key, name in same.items():
        assert found[name] == pytest.approx(table["field"][key], rel=1e-12), name
    # A metric of its own takes the place of the one made from the field, and only that one.
    assert found["cost"] == 1.0
    assert found["insulation_margin_K"] == -5.0
    assert found["mass_kg"] > 0.0


def test_excitation_reaches_the_request() -> None:
    """Ampere-turns of the request are those that the metrics are made with."""
    from evaluators.external.request import request_files

    task = machines.task()
    sections = machines.sections(task, machines.designs())
    exciting = excitation(sections, np.array([6e6]), task.duty, task.construction)
    files = request_files(task, sections, exciting, 0, machines.DESIGN, True, (), False)
    sent = json.loads(files["request.json"])["excitation"]
    assert sent["torque_peak_A"] == exciting.torque[0]
    assert sent["suspension_peak_A"] == exciting.suspension[0]
