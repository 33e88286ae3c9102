"""Whatever a program outside gets wrong is a row with a clear reason, in time."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
import time
from dataclasses import MISSING, fields
from pathlib import Path

import machines
import numpy as np
import pytest

from evaluators.external.evaluator import ExternalEvaluator
from evaluators.external.quantities import FIELD
from evaluators.external.wording import LONGEST_REASON
from evaluators.interface import EvaluatorError, Status
from evaluators.machine.field import FieldSolution

HERE = Path(__file__).parent
FAULTY = HERE / "faulty.sh"

pytestmark = pytest.mark.skipif(
    shutil.which("sh") is None or shutil.which("awk") is None, reason="needs sh and awk"
)


def evaluator(folder: Path, *arguments: str, **settings: object) -> ExternalEvaluator:
    built = ExternalEvaluator(
        machines.task(),
        {
            "program": ["sh", str(FAULTY), *arguments],
            "folder": str(folder),
            "field": False,
            "metrics": ["cost"],
            "timeout_s": 20.0,
            **settings,
        },
    )
    built.allow_program()
    return built


FAULTS = {
    "crash": 'ended with exit code 3; its last words: "no licence server"',
    "signal": "ended with signal 11",
    "silent": "wrote no reply.json",
    "refusing": "no convergence",
    "garbage": "wrote a reply that is no JSON",
    "bytes": "wrote a reply that is not UTF-8 text at byte 1",
    "huge": "wrote a reply.json of more than 1,048,576 bytes",
    "deep": "nested too deeply",
    "nested": "nested deeper than 3 levels",
    "nan": "wrote NaN, which is no number of JSON",
    "infinite": "gave metrics cost = inf, which is not a finite number",
    "negative": "gave metrics cost = -1, which must lie between 0 and 1e+30",
    "text": "gave metrics cost = '7.5' instead of a number",
    "digits": "wrote a reply with a number of thousands of digits",
    "missing": "left out metrics cost",
    "unknown": "which is not asked for",
    "twice": "gave the key 'cost' twice",
    "version": "gave format_version 2 instead of 1",
    "pipe": "left a reply.json that is no plain file",
    "link": "left a reply.json that cannot be opened",
    "folder": "left a reply.json that is no plain file",
}


@pytest.mark.parametrize(("mode", "words"), FAULTS.items(), ids=FAULTS.keys())
def test_fault_is_a_row_with_a_reason(tmp_path: Path, mode: str, words: str) -> None:
    result = evaluator(tmp_path, mode).evaluate(machines.designs())
    assert result.status.tolist() == [Status.FAILED.value]
    (reason,) = result.reason.tolist()
    assert words in reason
    assert reason.isprintable()
    assert len(reason) <= LONGEST_REASON
    reason.encode()  # no lone surrogates, which the archive could not store
    assert np.isnan(result.metrics["cost"]).all()
    # The working folder is kept, with what was sent and why it failed.
    (kept,) = tmp_path.iterdir()
    assert kept.name.startswith("design-")
    assert (kept / "reason.txt").read_text().strip() == reason
    assert json.loads((kept / "request.json").read_text())["format_version"] == 1


def test_the_same_failure_again_takes_the_place_of_its_folder(tmp_path: Path) -> None:
    failing = evaluator(tmp_path, "crash")
    first, second = (failing.evaluate(machines.designs()) for _ in range(2))
    assert first.reason.tolist() == second.reason.tolist()
    assert len(list(tmp_path.iterdir())) == 1
    limited = evaluator(tmp_path / "few", "crash", kept_failures=2)
    limited.evaluate(machines.scattered(5, seed=2))
    assert len(list((tmp_path / "few").iterdir())) == 2


def test_hanging_program_dies_with_its_children(tmp_path: Path) -> None:
    child = tmp_path / "child"
    hanging = evaluator(tmp_path / "work", "hang", str(child), timeout_s=0.5, retries=3)
    begin = time.monotonic()
    result = hanging.evaluate(machines.designs())
    # The limit of 0.5 s once, not once for each retry, and room for a busy machine.
    assert time.monotonic() - begin < 5.0
    assert result.status.tolist() == [Status.TIMED_OUT.value]
    assert result.reason[0] == (
        'sh was stopped at its time limit of 0.5 s; its last words: "still going"'
    )
    assert gone(int(child.read_text()))


def test_flood_of_output_is_stopped(tmp_path: Path) -> None:
    result = evaluator(tmp_path, "flood").evaluate(machines.designs())
    assert "printed too much" in result.reason[0]
    assert len(result.reason[0]) <= LONGEST_REASON


def test_failed_rows_leave_the_others_alone(tmp_path: Path) -> None:
    flag = tmp_path / "flag"
    batch = machines.designs(3)
    batch["magnet_thickness_mm"][0] = 19.0
    result = evaluator(tmp_path / "work", "flaky", str(flag)).evaluate(batch)
    assert result.status.tolist() == ["invalid geometry", "failed", "ok"]
    assert result.metrics["cost"][2] == 7.5


def test_retry_after_a_crash(tmp_path: Path) -> None:
    flag = tmp_path / "flag"
    result = evaluator(tmp_path / "work", "flaky", str(flag), retries=1).evaluate(
        machines.designs()
    )
    assert result.status.tolist() == ["ok"]
    refusing = evaluator(tmp_path / "work", "refusing", retries=5)
    assert refusing.evaluate(machines.designs()).status.tolist() == ["failed"]


def test_folders_are_kept_as_asked(tmp_path: Path) -> None:
    for keep, count in (("all", 1), ("failed", 0), ("none", 0)):
        folder = tmp_path / keep
        result = evaluator(folder, "right", keep=keep).evaluate(machines.designs())
        assert result.metrics["cost"].tolist() == [7.5]
        assert len(list(folder.iterdir())) == count
    evaluator(tmp_path / "gone", "crash", keep="none").evaluate(machines.designs())
    assert list((tmp_path / "gone").iterdir()) == []


def test_folder_that_cannot_be_made(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("x")
    result = evaluator(tmp_path / "file" / "below", "right").evaluate(machines.designs())
    assert result.status.tolist() == ["failed"]
    assert "could not be run" in result.reason[0]
    assert "\n" not in result.reason[0]


def test_program_that_is_not_there(tmp_path: Path) -> None:
    missing = ExternalEvaluator(machines.task(), {"program": [str(tmp_path / "no_such")]})
    with pytest.raises(EvaluatorError, match="no_such"):
        missing.allow_program()


def test_no_more_runs_at_a_time_than_licences(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Two processes with one licence: the program would notice a second one."""
    monkeypatch.setenv("TMPDIR", str(tmp_path))
    script = tmp_path / "two.py"
    script.write_text(
        "import sys, time; from pathlib import Path\n"
        f"sys.path[:0] = [{str(HERE)!r}, {str(HERE.parent)!r}, {str(HERE.parents[2])!r}]\n"
        "import machines, test_external_faults as t\n"
        f"e = t.evaluator(Path({str(tmp_path / 'work')!r}), 'counting', {str(tmp_path)!r}, "
        "concurrency=int(sys.argv[1]))\n"
        "ready = Path(sys.argv[2])\n"
        "(ready / sys.argv[3]).touch()\n"
        "while len(list(ready.iterdir())) < 2: time.sleep(0.005)\n"  # or they may never meet
        "print(e.evaluate(machines.designs(3)).reason.tolist())\n"
    )

    def outputs(licences: str) -> list[str]:
        ready = tmp_path / f"ready{licences}"
        ready.mkdir()
        command = [sys.executable, str(script), licences, str(ready)]
        runs = [
            subprocess.Popen([*command, name], stdout=subprocess.PIPE, text=True)
            for name in ("one", "other")
        ]
        return [run.communicate(timeout=120)[0].strip() for run in runs]

    assert outputs("1") == [str([""] * 3)] * 2
    # The check above can fail: with two licences both run at once.
    assert any("two at a time" in text for text in outputs("2"))


def test_killed_evaluator_takes_its_program_along(tmp_path: Path) -> None:
    child = tmp_path / "child"
    script = tmp_path / "one.py"
    script.write_text(
        "import sys; from pathlib import Path\n"
        f"sys.path[:0] = [{str(HERE)!r}, {str(HERE.parent)!r}, {str(HERE.parents[2])!r}]\n"
        "import machines, test_external_faults as t\n"
        f"t.evaluator(Path({str(tmp_path / 'work')!r}), 'hang', {str(child)!r}, timeout_s=300.0)"
        ".evaluate(machines.designs())\n"
    )
    run = subprocess.Popen([sys.executable, script])
    deadline = time.monotonic() + 60.0
    while not (child.exists() and child.read_text().endswith("\n")):
        assert time.monotonic() < deadline
        time.sleep(0.05)
    time.sleep(0.5)  # the program may be quicker than its keeper, who tells the guard of it
    os.kill(run.pid, signal.SIGKILL)
    run.wait()
    assert gone(int(child.read_text()))


def gone(process: int, within_s: float = 60.0) -> bool:
    """Whether a process ends (or is a zombie nobody reaps) within the time."""
    deadline = time.monotonic() + within_s
    while time.monotonic() < deadline:
        try:
            os.kill(process, 0)
            state = Path(f"/proc/{process}/stat")
            if state.exists() and state.read_text().rpartition(")")[2].split()[0] == "Z":
                return True
        except (ProcessLookupError, FileNotFoundError):
            return True
        time.sleep(0.02)
    return False


def test_document_lists_every_key_of_the_exchange() -> None:
    text = (HERE.parents[2] / "evaluators/external/EXCHANGE.md").read_text()
    for item in FIELD:
        assert f"`{item.key}`" in text
    needed = {item.name for item in fields(FieldSolution) if item.default is MISSING}
    assert {item.attribute for item in FIELD} == needed
    request = tmp_request()
    for key in request:
        assert f"`{key}`" in text, key


def tmp_request() -> dict[str, object]:
    from evaluators.external.request import request_files
    from evaluators.machine.field import excitation

    task = machines.task()
    sections = machines.sections(task, machines.designs())
    exciting = excitation(sections, np.array([6e6]), task.duty, task.construction)
    files = request_files(task, sections, exciting, 0, machines.DESIGN, True, ("cost",), True)
    assert files["cross_section.dxf"].startswith(b"  0\n")
    content: dict[str, object] = json.loads(files["request.json"])
    return content
