"""Commands on a cluster: the same results as on one machine, and clear words when it fails."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from click.testing import Result
from clusters import LocalCluster

from studies import api
from studies.errors import StudiesError
from studies.stored.verified import verified_folder

pytest.importorskip("distributed")

Run = Callable[..., Result]
Write = Callable[..., Path]
Rows = Callable[[Path], list[dict[str, Any]]]
Process = Callable[..., "subprocess.CompletedProcess[str]"]

PROJECT = Path(__file__).parents[2]
SLOW = ('name = "toy"', 'name = "toy"\n[evaluator.settings]\ndelay_s = 0.1')
ONE_FAMILY = ('list = ["Q6p2s1", "Q12p4s5"]', 'list = ["Q6p2s1"]')
FAMILIES = ("Q6p2s1", "Q12p4s5")
NOWHERE = "tcp://127.0.0.1:1"


@pytest.fixture(scope="module")
def environment(site: Path) -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": os.pathsep.join([str(site), str(PROJECT)])}


@pytest.fixture(scope="module")
def machines(
    tmp_path_factory: pytest.TempPathFactory, environment: dict[str, str]
) -> Iterator[LocalCluster]:
    with LocalCluster(tmp_path_factory.mktemp("machines"), environment) as made:
        yield made


def one_sentence(result: Result, code: int) -> str:
    assert result.exit_code == code, result.output
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert len(result.output.strip().splitlines()) == 1
    return result.output


def test_sweep_and_resume_give_what_one_machine_gives(
    hovergap: Run, process: Process, write_study: Write, rows: Rows, machines: LocalCluster
) -> None:
    file = write_study()
    done = process("sweep", file, "--cluster", machines.address, "--budget", "60")
    assert done.returncode == 0, done.stdout + done.stderr
    assert done.stderr == ""
    result = hovergap("resume", "results/small", "--cluster", machines.file, "--budget", "120")
    assert result.exit_code == 0, result.output
    whole = ("--results", "whole", "--workers", "1", "--budget", "120")
    assert hovergap("sweep", file, *whole).exit_code == 0
    for family in FAMILIES:
        assert rows(Path("results/small") / family) == rows(Path("whole/small") / family)


@pytest.mark.slow
def test_verify_and_tolerance_give_what_one_machine_gives(
    hovergap: Run, write_study: Write, machines: LocalCluster
) -> None:
    file, folder = write_study(), "results/small"
    assert hovergap("sweep", file, "--workers", "1", "--budget", "120").exit_code == 0
    tables, texts = [], []
    for where in (("--cluster", machines.address), ("--workers", "1")):
        result = hovergap("verify", folder, "--evaluator", "toy_finer", "--top", "3", *where)
        assert result.exit_code == 0, result.output
        found = api.verified(folder, "toy_finer")
        tables.append(found.drop_columns(["time_s", "finished_at"]))
        for family in FAMILIES:
            shutil.rmtree(verified_folder(Path(folder) / family, "toy_finer"))
        design = f"Q6p2s1-{found['evaluation'][0].as_py():06d}"
        result = hovergap("tolerance", folder, design, "--machines", "20", *where)
        assert result.exit_code == 0, result.output
        texts.append(result.output)
    assert tables[0].num_rows >= 6
    assert tables[0].equals(tables[1])
    assert "Yield against all limits" in texts[0]
    assert texts[0] == texts[1]


def test_ctrl_c_ends_cleanly_and_one_machine_goes_on(
    hovergap: Run, write_study: Write, rows: Rows, machines: LocalCluster
) -> None:
    file = write_study(SLOW, ONE_FAMILY)
    child = subprocess.Popen(
        [
            sys.executable,
            "-m",
            "studies",
            "sweep",
            str(file),
            "--cluster",
            machines.address,
            "--budget",
            "2000",
        ],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    deadline = time.monotonic() + 30.0
    while not list(Path("results").glob("*/*/part-*.parquet")):
        assert child.poll() is None, child.communicate()
        assert time.monotonic() < deadline
        time.sleep(0.02)
    os.killpg(child.pid, signal.SIGINT)
    output, errors = child.communicate(timeout=60)
    assert child.returncode == 130, output + errors
    assert errors.strip() == "finishing the designs in hand; once more stops at once"
    assert "hovergap resume results/small" in output
    stored = rows(Path("results/small/Q6p2s1"))
    more = len(stored) + 10
    result = hovergap("resume", "results/small", "--workers", "1", "--budget", str(more))
    assert result.exit_code == 0, result.output
    after = rows(Path("results/small/Q6p2s1"))
    assert len(after) == more
    assert after[: len(stored)] == stored


@pytest.mark.slow
def test_a_lost_cluster_says_how_to_go_on(
    hovergap: Run, write_study: Write, rows: Rows, tmp_path: Path, environment: dict[str, str]
) -> None:
    folder = tmp_path / "machines"
    folder.mkdir()
    with LocalCluster(folder, environment, workers=1, nanny=False) as machines:
        child = subprocess.Popen(
            [
                *(sys.executable, "-m", "studies", "sweep", str(write_study(SLOW))),
                *("--cluster", machines.address),
            ],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        )
        while not list(Path("results").glob("*/*/part-*.parquet")):
            assert child.poll() is None, child.communicate()
            time.sleep(0.02)
        machines.scheduler.kill()
        begin = time.monotonic()
        output, errors = child.communicate(timeout=60)
    assert child.returncode == 1, output + errors
    assert time.monotonic() - begin < 30.0  # not for ever, on a busy machine either
    assert errors == ""
    assert "the scheduler of the cluster tcp://127.0.0.1:" in output
    assert "Everything evaluated so far is stored. Go on with:\n  hovergap resume" in output
    result = hovergap("resume", "results/small", "--workers", "1")
    assert result.exit_code == 0, result.output
    assert [len(rows(Path("results/small") / family)) for family in FAMILIES] == [200, 200]


def test_a_wrong_address_creates_nothing(
    hovergap: Run, write_study: Write, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("optimizer.workers.cluster.CONNECT_S", 0.5)
    output = one_sentence(hovergap("sweep", write_study(), "--cluster", NOWHERE), 2)
    assert f"no scheduler of a cluster answers at '{NOWHERE}'" in output
    assert not Path("results").exists()


def test_workers_and_cluster_exclude_each_other(hovergap: Run, write_study: Write) -> None:
    options = ("--workers", "2", "--cluster", NOWHERE)
    output = one_sentence(hovergap("sweep", write_study(), *options), 2)
    assert "workers and cluster exclude each other" in output
    with pytest.raises(StudiesError, match="exclude each other"):
        api.sweep(write_study(), workers=2, cluster=NOWHERE)


def test_without_the_extra_it_is_said_what_to_install(
    hovergap: Run, write_study: Write, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    output = one_sentence(hovergap("sweep", write_study(), "--cluster", NOWHERE), 2)
    assert "pip install 'hovergap[cluster]'" in output


def test_a_program_needs_consent_on_a_cluster_too(hovergap: Run, write_study: Write) -> None:
    settings = 'name = "external"\n[evaluator.settings]\nprogram = ["true"]\nfolder = "."'
    file = write_study(('name = "toy"', settings))
    result = hovergap("sweep", file, "--cluster", NOWHERE)
    assert result.exit_code == 2
    assert "add --allow-program" in result.output
