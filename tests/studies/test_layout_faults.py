"""The files of a study beside its archives: there in full or not at all, whatever breaks."""

from __future__ import annotations

import importlib.util
import os
import signal
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from types import ModuleType

import pytest
from click.testing import Result

from studies.errors import StorageError
from studies.stored.layout import Request, create, open_results, save_request
from studies.study_file.definition import study_from

Run = Callable[..., Result]
Write = Callable[..., Path]
HERE = Path(__file__).parent
REQUEST = Request("/nowhere/small.toml", ("Q6p2s1",), 30, 3)


@pytest.fixture(scope="module")
def faults() -> ModuleType:
    """The faults of the archive's tests; they count what changes files."""
    spec = importlib.util.spec_from_file_location("faults", HERE.parent / "optimizer/faults.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules["faults"] = module
    spec.loader.exec_module(module)
    return module


def attempt(
    faults: ModuleType, root: Path, fault: str, at: int, work: Callable[[], object]
) -> tuple[int, dict]:
    def broken() -> dict:
        steps = faults.Steps(root, fault, at)
        steps.arm()
        said = ""
        try:
            work()
            if fault == "power":
                steps.step("after all")
        except StorageError as error:
            said = str(error)
        steps.disarm()
        return {"steps": steps.names, "said": said}

    return faults.forked(broken)


@pytest.mark.parametrize("fault", ["kill", "power", "ENOSPC"])
def test_a_study_is_made_in_full_or_not_at_all(
    faults: ModuleType, write_study: Write, study_text: str, tmp_path: Path, fault: str
) -> None:
    study = study_from(write_study().read_bytes(), "small.toml")
    (tmp_path / "count").mkdir()
    _, told = attempt(
        faults,
        tmp_path / "count",
        "none",
        0,
        lambda: create(tmp_path / "count" / "results", study, REQUEST),
    )
    assert len(told["steps"]) >= 8
    # The power may also be cut when all is done: then the study has to be there.
    for at in range(1, len(told["steps"]) + 1 + (fault == "power")):
        root = tmp_path / f"{at}" / "results"
        root.parent.mkdir()
        code, said = attempt(
            faults, root.parent, fault, at, lambda root=root: create(root, study, REQUEST)
        )
        if fault == "ENOSPC":
            assert code == 0
            assert not said["said"] or "the disk is full" in said["said"]
        else:
            assert code == (-signal.SIGKILL if fault == "kill" else faults.POWER_CUT)
        if not (root / "small").exists():
            assert at <= len(told["steps"])
            create(root, study, REQUEST)
        found = open_results(root / "small")
        assert found.study.content == study.content
        assert found.request == replace(REQUEST, hovergap=found.request.hovergap)
        assert found.request.hovergap
        assert [item.name for item in root.iterdir()] == ["small"]


def test_what_a_killed_process_left_is_removed(write_study: Write, tmp_path: Path) -> None:
    study = study_from(write_study().read_bytes(), "small.toml")
    root = tmp_path / "results"
    process = os.fork()  # a number that no process has any more
    if not process:
        os._exit(0)
    os.waitpid(process, 0)
    for name in (f".small.{process}", f".small.{os.getpid()}.x", f".smaller.{process}"):
        (root / name).mkdir(parents=True)
        (root / name / "study.toml").touch()
    create(root, study, REQUEST)
    assert sorted(item.name for item in root.iterdir()) == sorted(
        [f".small.{os.getpid()}.x", f".smaller.{process}", "small"]
    )


@pytest.mark.parametrize("fault", ["kill", "power", "ENOSPC"])
def test_the_old_request_or_the_new_one(
    faults: ModuleType, write_study: Write, hovergap: Run, tmp_path: Path, fault: str
) -> None:
    study = study_from(write_study().read_bytes(), "small.toml")
    count = create(tmp_path / "count", study, REQUEST)
    larger = replace(count.request, evaluations_per_family=45)
    _, told = attempt(faults, tmp_path / "count", "none", 0, lambda: save_request(count, larger))
    assert len(told["steps"]) >= 4
    for at in range(1, len(told["steps"]) + 1):
        results = create(tmp_path / f"{at}", study, REQUEST)
        attempt(
            faults,
            tmp_path / f"{at}",
            fault,
            at,
            lambda results=results: save_request(results, larger),
        )
        assert open_results(results.folder).request in (results.request, larger)


def test_a_search_removes_what_a_killed_process_left(
    write_study: Write, hovergap: Run, tmp_path: Path
) -> None:
    study = study_from(write_study().read_bytes(), "small.toml")
    results = create(tmp_path / "results", study, REQUEST)
    (results.folder / ".study.json.123").write_text("{")
    result = hovergap("resume", results.folder, "--workers", "1")
    assert result.exit_code == 0, result.output
    assert not (results.folder / ".study.json.123").exists()
