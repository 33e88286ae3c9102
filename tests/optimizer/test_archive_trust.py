"""The archive believes no part that is damaged, of another study or of a newer program."""

from __future__ import annotations

import json
from dataclasses import replace

import pyarrow.compute as pc
import pyarrow.parquet as pq
import pytest
from archived import BUDGET, SETTINGS

from optimizer.archive.archive import open_archive
from optimizer.archive.identity import IDENTITY_KEY, differences, identity_of
from optimizer.archive.parts import (
    DamagedPartError,
    check_part,
    part_paths,
    read_part,
    write_part,
)
from optimizer.errors import ArchiveError, ArchiveMismatchError
from optimizer.problem import Variable
from optimizer.running.runner import run
from optimizer.settings import Settings


def test_every_changed_byte_of_a_part_is_found(tmp_path, plates):
    run(plates, tmp_path, Settings(budget=100, population=100))
    path = part_paths(tmp_path)[0]
    good = path.read_bytes()
    check_part(path)
    places = {*range(0, len(good), 101), *range(len(good) - 200, len(good), 5)}
    for place in places:
        path.write_bytes(good[:place] + bytes([good[place] ^ 0x10]) + good[place + 1 :])
        with pytest.raises(DamagedPartError):
            check_part(path)


def test_pages_carry_checksums_that_readers_can_verify(tmp_path, plates):
    run(plates, tmp_path, Settings(budget=100, population=100))
    path = part_paths(tmp_path)[0]
    column = pq.ParquetFile(path).metadata.row_group(0).column(2)
    assert column.path_in_schema == "x_mm"
    data = bytearray(path.read_bytes())
    data[column.data_page_offset + column.total_compressed_size - 5] ^= 1  # among the numbers
    path.write_bytes(data)
    with pytest.raises(OSError, match="CRC"):
        pq.read_table(path, page_checksum_verification=True)
    with pytest.raises(DamagedPartError):
        read_part(path)


@pytest.mark.usefixtures("many_parts")
@pytest.mark.parametrize("damage", ["truncated", "empty", "flipped", "zero tail", "foreign"])
def test_a_damaged_part_is_set_aside_and_evaluated_again(
    tmp_path, plates, rows_of, damage, monkeypatch
):
    whole, broken = tmp_path / "whole", tmp_path / "broken"
    run(plates, whole, SETTINGS)
    run(plates, broken, SETTINGS)
    path = part_paths(broken)[3]
    data = path.read_bytes()
    flipped = data[:200] + bytes([data[200] ^ 4]) + data[201:]
    foreign = part_paths(whole)[0].read_bytes().replace(b'"seed": 7', b'"seed": 8')
    path.write_bytes(
        {
            "truncated": data[: len(data) // 2],
            "empty": b"",
            "flipped": flipped,
            "zero tail": data[:-64] + bytes(64),
            "foreign": foreign,
        }[damage]
    )
    counted = []
    evaluate = plates.evaluate
    monkeypatch.setattr(plates, "evaluate", lambda x: counted.append(len(x)) or evaluate(x))
    summary = run(plates, broken, SETTINGS)
    assert summary.damaged == (broken / "quarantine" / path.name,)
    assert summary.damaged[0].is_file()
    assert sum(counted) == summary.new == 25  # one chunk: the rest is kept
    assert rows_of(broken).equals(rows_of(whole))


@pytest.mark.usefixtures("many_parts")
def test_a_reader_names_damaged_parts_and_gives_the_rest(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    path = part_paths(tmp_path)[2]
    path.write_bytes(path.read_bytes()[:-10])
    reader = open_archive(tmp_path)
    assert reader.table(["evaluation"]).num_rows == BUDGET - 25
    assert reader.damaged == (path,)
    assert path.exists()  # reading changes nothing


def test_a_damaged_or_missing_identity_is_taken_from_a_part(tmp_path, plates, rows_of):
    run(plates, tmp_path, SETTINGS)
    before = rows_of(tmp_path)
    for text in ("{broken", '{"schema_version": "x"}', "[]", None):
        path = tmp_path / "archive.json"
        path.unlink(missing_ok=True)
        if text is not None:
            path.write_text(text)
        assert open_archive(tmp_path).settings["seed"] == 7
        with pytest.raises(ArchiveMismatchError, match="seed 7 there and 8 here"):
            run(plates, tmp_path, Settings(**{**vars(SETTINGS), "seed": 8}))
    assert rows_of(tmp_path).equals(before)


def test_another_study_is_refused_and_what_differs_is_said(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    plates.variables = (Variable("x_mm", -1.0, 2.5), *plates.variables[1:])
    labels = {"study": "beams", "study_digest": "0badc0de"}
    other = Settings(**{**vars(SETTINGS), "labels": labels, "evaluator_version": "4"})
    with pytest.raises(ArchiveMismatchError) as caught:
        run(plates, tmp_path, other)
    said = str(caught.value)
    assert said.startswith(f"{tmp_path} holds evaluations of another study or of other settings")
    assert "study 'plates' there and 'beams' here" in said
    assert "version of the evaluator '3' there and '4' here" in said
    assert "x_mm from -1 to 3 there and from -1 to 2.5 here" in said
    assert "digest" not in said  # tells a reader nothing
    assert "0badc0de" not in said
    assert "\n" not in said


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"seed": 8}, "seed 7 there and 8 here"),
        ({"population": 20}, "population 100 there and 20 here"),
        ({"chunk": 5}, "designs per call 25 there and 5 here"),
        ({"evaluator": "finer"}, "evaluator 'toy' there and 'finer' here"),
        ({"labels": {"study": "plates", "study_digest": "5"}}, "settings of the study that have"),
        ({"objectives": ["near", "wide"]}, "objective far only there; objective wide only here"),
        ({"objectives": ["far", "near"]}, "the objectives in another order"),
        ({"constraints": []}, "limit right_of_half only there"),
        ({"columns": [["word", "string"]]}, "column rest_mm2 only there"),
        ({"columns": [["rest_mm2", "float64"], ["word", "int64"]]}, "that have no name here"),
        ({"variables": [["x_mm", -1.0, 3.0]]}, "variable fixed_mm, y_mm, z_mm only there"),
        ({"variables": [["x_mm", 2.0, 2.0]]}, "x_mm from -1 to 3 there and fixed at 2 here"),
        ({"schema_version": 0}, "schema version 1 there and 0 here"),
    ],
)
def test_every_difference_is_said_in_words(plates, change, said):
    settings = replace(SETTINGS, labels={"study": "plates", "study_digest": "4"})
    there = identity_of(plates, settings)
    text = "; ".join(differences(there, {**there, **change}))
    assert said in text
    assert "digest" not in text


def test_an_integer_is_told_from_a_real_variable_with_the_same_bounds(plates):
    real = identity_of(plates, SETTINGS)
    first, *others = plates.variables
    plates.variables = (replace(first, integer=True), *others)
    text = "; ".join(differences(real, identity_of(plates, SETTINGS)))
    assert f"{first.name} from -1 to 3 there and from -1 to 3 integer here" in text


def test_a_newer_schema_version_is_refused(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    path = tmp_path / "archive.json"
    path.write_text(path.read_text().replace('"schema_version": 1', '"schema_version": 2'))
    with pytest.raises(ArchiveError, match="schema version 2; this version reads up to 1"):
        open_archive(tmp_path)


def _relabelled(table, **change):
    """A table whose metadata say that it belongs elsewhere."""
    identity = {**json.loads(table.schema.metadata[IDENTITY_KEY]), **change}
    return table.replace_schema_metadata({IDENTITY_KEY: json.dumps(identity)})


@pytest.mark.usefixtures("many_parts")
def test_a_newer_part_is_refused_and_not_set_aside(tmp_path, plates):
    run(plates, tmp_path, SETTINGS)
    old = part_paths(tmp_path)[4]
    new = write_part(tmp_path, 90, _relabelled(read_part(old), schema_version=2))
    said = f"{new.name} has schema version 2; this version reads up to 1: update the program"
    with pytest.raises(ArchiveError, match=said):
        open_archive(tmp_path).table()
    with pytest.raises(ArchiveError, match=said):
        run(plates, tmp_path, SETTINGS)
    assert new.is_file()


@pytest.mark.usefixtures("many_parts")
def test_a_part_of_another_study_with_the_same_columns_does_not_count(tmp_path, plates, rows_of):
    run(plates, tmp_path / "own", SETTINGS)
    run(plates, tmp_path / "other", replace(SETTINGS, seed=8, labels={"study": "beams"}))
    whole = rows_of(tmp_path / "own")
    foreign = part_paths(tmp_path / "other")[9]
    named = "belongs to another archive (study 'beams' there and 'plates' here; seed 8 there"
    nameless = "it does not say which study it belongs to"
    for stranger, words in (
        (read_part(foreign), named),
        (read_part(foreign).replace_schema_metadata(None), nameless),
    ):
        # It takes the place of a part, and is the only one to hold those evaluations.
        gone = part_paths(tmp_path / "own")[9]
        put = write_part(tmp_path / "own", 9, stranger)
        gone.unlink()
        reader = open_archive(tmp_path / "own")
        missing = whole.filter(pc.is_in(whole["evaluation"], stranger["evaluation"]))
        assert 0 < missing.num_rows < whole.num_rows
        assert reader.rows == whole.num_rows - missing.num_rows
        assert reader.damaged == (put,)
        assert words in reader.trouble(put)
        assert reader.trouble(part_paths(tmp_path / "own")[0]) == ""
        assert reader.rows_of(missing["evaluation"].to_numpy()).num_rows == 0
        front = reader.front()
        assert set(front["seed"].to_pylist()) == {7}
        # The writer sets it aside and evaluates again what is missing.
        summary = run(plates, tmp_path / "own", SETTINGS)
        assert [path.name for path in summary.damaged] == [put.name]
        assert summary.new == missing.num_rows
        assert rows_of(tmp_path / "own").equals(whole)


@pytest.mark.usefixtures("many_parts")
def test_what_most_parts_say_counts_where_the_identity_is_lost(tmp_path, plates):
    run(plates, tmp_path / "own", SETTINGS)
    run(plates, tmp_path / "other", replace(SETTINGS, seed=8))
    identity = (tmp_path / "other" / "archive.json").read_bytes()
    # The first part is the foreign one.
    gone = part_paths(tmp_path / "own")[0]
    write_part(tmp_path / "own", 0, read_part(part_paths(tmp_path / "other")[0]))
    gone.unlink()
    (tmp_path / "own" / "archive.json").unlink()
    reader = open_archive(tmp_path / "own")
    assert reader.settings["seed"] == 7
    assert reader.rows == BUDGET - 25
    # An identity that no part agrees with does not count either, and is mended by the writer.
    part_paths(tmp_path / "own")[0].unlink()
    file = tmp_path / "own" / "archive.json"
    for text in (identity, None):
        file.write_bytes(identity) if text else file.unlink()
        assert open_archive(tmp_path / "own").settings["seed"] == 7
        with pytest.raises(ArchiveMismatchError, match="seed 7 there and 8 here"):
            run(plates, tmp_path / "own", replace(SETTINGS, seed=8))
    assert run(plates, tmp_path / "own", SETTINGS).new == 25
    assert json.loads(file.read_text())["seed"] == 7
