"""The archive: what is stored, how parts are written, and that errors say one clear sentence."""

from __future__ import annotations

import errno
import json
import os
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from archived import BUDGET, SETTINGS

from optimizer.archive import archive as archive_module
from optimizer.archive import durable, merging
from optimizer.archive.archive import Archive, is_archive, open_archive
from optimizer.archive.parts import (
    part_paths,
)
from optimizer.errors import ArchiveError, ArchiveLockedError
from optimizer.fronts import non_dominated
from optimizer.running.runner import run
from optimizer.settings import Settings


def test_a_row_holds_the_design_its_outcome_and_where_it_comes_from(tmp_path, failing_plates):
    run(failing_plates, tmp_path, SETTINGS)
    table = open_archive(tmp_path).table()
    assert table.schema.names == [
        "evaluation", "generation", "x_mm", "fixed_mm", "y_mm", "z_mm", "status", "reason",
        "rest_mm2", "word", "objective:near", "objective:far", "margin:right_of_half",
        "feasible", "evaluator", "evaluator_version", "seed", "time_s", "finished_at",
    ]  # fmt: skip
    assert table["evaluation"].to_pylist() == list(range(BUDGET))
    assert table["generation"].to_pylist() == [i // 100 for i in range(BUDGET)]
    x = np.column_stack([table[v.name].to_numpy() for v in failing_plates.variables])
    outcome = failing_plates.evaluate(x)
    assert table["status"].to_pylist() == outcome.status.tolist()
    assert table["reason"].to_pylist() == outcome.reason.tolist()
    assert table["feasible"].to_pylist() == outcome.feasible.tolist()
    assert np.array_equal(table["objective:far"].to_numpy(), outcome.objectives[:, 1])
    assert np.array_equal(table["margin:right_of_half"].to_numpy(), outcome.constraints[:, 0])
    assert table["word"].to_pylist() == outcome.columns["word"].tolist()
    assert set(table["evaluator_version"].to_pylist()) == {"3"}
    assert set(table["seed"].to_pylist()) == {7}
    assert table.schema.field("generation").type == pa.int32()
    assert table.schema.field("finished_at").type == pa.timestamp("us", tz="UTC")


def test_columns_say_their_unit_and_parts_what_they_belong_to(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    # With the library alone, as a user without this package would.
    schema = pq.read_schema(next(tmp_path.glob("part-*.parquet")))
    field = schema.field("rest_mm2").metadata
    assert field[b"unit"] == b"mm2"
    assert field[b"role"] == b"metric"
    assert b"squared distance" in field[b"description"]
    identity = json.loads(schema.metadata[b"optimizer.identity"])
    assert identity["seed"] == 7
    assert identity["labels"] == {"study": "plates"}
    assert identity["variables"][0] == ["x_mm", -1.0, 3.0]
    assert schema.metadata[b"optimizer.schema_version"] == b"1"


def test_numbers_that_are_nan_are_stored_as_null(tmp_path, plates):
    plates.evaluate = lambda x: _with_nan(type(plates).evaluate(plates, x))
    run(plates, tmp_path, SETTINGS)
    table = open_archive(tmp_path).table()
    assert table["rest_mm2"].null_count == BUDGET


def _with_nan(outcome):
    columns = {**outcome.columns, "rest_mm2": np.full(len(outcome), np.nan)}
    return type(outcome)(outcome.objectives, outcome.constraints, columns=columns)


def test_the_reader_gives_chosen_columns_rows_and_the_front(tmp_path, plates):
    summary = run(plates, tmp_path, SETTINGS)
    assert is_archive(tmp_path)
    reader = open_archive(str(tmp_path))
    assert reader.rows == BUDGET
    assert reader.settings["objectives"] == ["near", "far"]
    chosen = reader.table(["z_mm", "evaluation"])
    assert chosen.schema.names == ["z_mm", "evaluation"]
    assert reader.row(5)["z_mm"] == chosen["z_mm"][5].as_py()
    with pytest.raises(ArchiveError, match="no evaluation 230; it has 230 rows"):
        reader.row(BUDGET)
    with pytest.raises(ArchiveError, match="has no column mass_kg"):
        reader.table(["mass_kg"])
    table = reader.table()
    feasible = np.flatnonzero(table["feasible"].to_numpy())
    names = ["objective:near", "objective:far"]
    points = np.column_stack([table[n].to_numpy()[feasible] for n in names])
    front = reader.front()
    assert front["evaluation"].to_pylist() == feasible[non_dominated(points)].tolist()
    assert front.schema.names == table.schema.names
    assert front.num_rows == summary.front_size
    # Without its file, and with an old one, the front follows from the rows.
    (tmp_path / "front.parquet").unlink()
    assert open_archive(tmp_path).front().equals(front)


def test_a_front_older_than_the_parts_is_not_believed(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    path, check = tmp_path / "front.parquet", tmp_path / ".front.crc"
    old, old_check = path.read_bytes(), check.read_bytes()
    run(plates, tmp_path, Settings(**{**vars(SETTINGS), "budget": 600}))
    new = open_archive(tmp_path).front()
    good, good_check = path.read_bytes(), check.read_bytes()
    # An old one, and one with a byte changed in its footer, where page checksums do not reach.
    flipped = good.replace(b"objective:near", b"objective:neas")
    assert flipped != good
    for data, its_check in ((old, old_check), (flipped, good_check)):
        path.write_bytes(data)
        check.write_bytes(its_check)
        assert open_archive(tmp_path).front().equals(new)


def test_a_folder_without_an_archive_is_named(tmp_path):
    assert not is_archive(tmp_path)
    with pytest.raises(ArchiveError, match="holds no archive"):
        open_archive(tmp_path)


def test_small_parts_are_merged_and_rows_twice_count_once(tmp_path, plates, rows_of, monkeypatch):
    monkeypatch.setattr(archive_module, "SHORTEST_INTERVAL_S", 0.0)
    monkeypatch.setattr(archive_module, "LARGEST_SHARE", 0.0)
    whole, killed = tmp_path / "whole", tmp_path / "killed"
    run(plates, whole, SETTINGS)
    assert len(part_paths(whole)) == 1
    # A writer killed after it wrote the merged part and before it removed the small ones.
    monkeypatch.setattr(Path, "unlink", lambda *args, **kwargs: None)
    run(plates, killed, SETTINGS)
    monkeypatch.undo()
    assert len(part_paths(killed)) == 11
    assert rows_of(killed).equals(rows_of(whole))
    assert run(plates, killed, SETTINGS).new == 0
    assert rows_of(killed).equals(rows_of(whole))
    assert [pq.read_metadata(path).num_rows for path in part_paths(killed)] == [BUDGET]


def test_parts_of_similar_size_are_merged_while_the_run_goes_on(
    tmp_path, plates, rows_of, monkeypatch
):
    monkeypatch.setattr(archive_module, "SHORTEST_INTERVAL_S", 0.0)
    monkeypatch.setattr(archive_module, "LARGEST_SHARE", 0.0)
    monkeypatch.setattr(merging, "MERGE_MEANWHILE", 4)
    seen, written = [], []
    write_one = archive_module.write_part

    def write_and_count(folder, number, table):
        written.append(table.num_rows)
        path = write_one(folder, number, table)
        seen.append(len(part_paths(folder)))
        return path

    monkeypatch.setattr(archive_module, "write_part", write_and_count)
    settings = replace(SETTINGS, budget=1_600)  # 64 chunks and parts
    run(plates, tmp_path / "many", settings)
    # At most three of each size from 16 to 1024 rows, and those being merged.
    assert max(seen) <= 3 * 4 + 4
    # A row is written once by itself and at most once for each larger size.
    assert sum(written) < 5 * 1_600
    monkeypatch.undo()
    run(plates, tmp_path / "few", settings)
    assert rows_of(tmp_path / "many").equals(rows_of(tmp_path / "few"))


def test_parts_are_written_about_once_a_second(tmp_path, plates):
    # 100 chunks of a fast evaluation; each as a part of its own would be 100.
    run(plates, tmp_path, Settings(budget=2_500, population=100))
    assert len(part_paths(tmp_path)) < 8


@pytest.mark.parametrize(
    ("code", "said"),
    [
        (errno.ENOSPC, "disk is full"),
        (errno.EACCES, "permission is denied"),
        (errno.EROFS, "read-only"),
        (errno.EIO, "input/output error"),
    ],
)
def test_a_disk_that_refuses_ends_in_one_sentence_and_loses_nothing(
    tmp_path, plates, rows_of, monkeypatch, code, said
):
    whole, full = tmp_path / "whole", tmp_path / "full"
    settings = Settings(**{**vars(SETTINGS), "budget": 600})
    run(plates, whole, settings)
    run(plates, full, SETTINGS)

    def refuse(handle: int) -> None:
        raise OSError(code, os.strerror(code))

    monkeypatch.setattr(durable.os, "fsync", refuse)
    with pytest.raises(ArchiveError, match=said) as caught:
        run(plates, full, settings)
    text = str(caught.value)
    assert str(full / "part-00000001") in text
    assert "\n" not in text
    monkeypatch.undo()
    assert not [p for p in full.iterdir() if p.name.startswith(".part")]
    assert open_archive(full).rows == BUDGET
    run(plates, full, settings)
    assert rows_of(full).equals(rows_of(whole))


@pytest.mark.skipif(os.geteuid() != 0, reason="mounting a small file system needs root")
def test_a_full_disk_in_earnest(tmp_path, plates, rows_of):
    disk = tmp_path / "disk"
    disk.mkdir()
    mounted = subprocess.run(["mount", "-t", "tmpfs", "-o", "size=300k", "tmpfs", str(disk)])
    if mounted.returncode:
        pytest.skip("mounting is not allowed here")
    try:
        with pytest.raises(ArchiveError, match="disk is full"):
            run(plates, disk / "study", Settings(budget=20_000))
        rows = open_archive(disk / "study").rows
        subprocess.run(["mount", "-o", "remount,size=30m", str(disk)], check=True)
        summary = run(plates, disk / "study", Settings(budget=20_000))
        assert summary.evaluations - summary.new == rows
        run(plates, tmp_path / "whole", Settings(budget=20_000))
        assert rows_of(disk / "study").equals(rows_of(tmp_path / "whole"))
    finally:
        subprocess.run(["umount", str(disk)], check=True)


def test_a_folder_below_a_file(tmp_path, plates):
    (tmp_path / "file").write_text("")
    with pytest.raises(ArchiveError, match="a part of its path is a file"):
        run(plates, tmp_path / "file" / "study", SETTINGS)


def test_two_writers_in_one_process(tmp_path, plates):
    with (
        Archive(tmp_path, plates, SETTINGS),
        pytest.raises(ArchiveLockedError, match=f"process {os.getpid()} on"),
    ):
        run(plates, tmp_path, SETTINGS)
    run(plates, tmp_path, SETTINGS)  # free again


def test_two_writers_in_two_processes_and_the_lock_of_a_dead_one(tmp_path, plates, python_path):
    run(plates, tmp_path, SETTINGS)
    code = "import sys, time, pathlib\nfrom optimizer.archive.lock import writer_lock\n"
    code += f"with writer_lock(pathlib.Path({str(tmp_path)!r})):\n"
    code += "    print('held', flush=True)\n    time.sleep(60)\n"
    with subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, env=python_path
    ) as holder:
        assert holder.stdout is not None
        assert holder.stdout.readline() == b"held\n"
        with pytest.raises(ArchiveLockedError, match=f"written by process {holder.pid} on"):
            run(plates, tmp_path, SETTINGS)
        assert open_archive(tmp_path).rows == BUDGET  # readers need no lock
        holder.kill()
    run(plates, tmp_path, Settings(**{**vars(SETTINGS), "budget": 300}))
    assert open_archive(tmp_path).rows == 300


def test_left_over_temporary_files_are_removed(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    left = tmp_path / ".part-00000009-00000000.parquet.123"
    left.write_bytes(b"torn")
    assert open_archive(tmp_path).rows == BUDGET
    run(plates, tmp_path, SETTINGS)
    assert not left.exists()
