import errno
import hashlib
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tidescour.errors import HandoffError
from tidescour.handoff import write
from tidescour.handoff.write import check_replaceable, recover_results, write_results

OLD = {"durations.csv": b"old durations\n", "figures/growth.png": b"old picture", "cycles.csv": b"old cycles\n"}
NEW = {"durations.csv": b"new durations\n", "figures/growth.png": b"new picture", "handoff.json": b"{}\n"}
KILLER = Path(__file__).with_name("kill_writer.py")


@pytest.fixture
def folder(tmp_path):
    return tmp_path / "site" / "plan_results"


def contents(folder):
    """Return what a folder holds, provenance apart, after a check of its manifest."""
    found = {path.relative_to(folder).as_posix(): path.read_bytes() for path in folder.rglob("*") if path.is_file()}
    provenance = json.loads(found.pop("provenance.json"))
    manifest = {file["name"]: file["sha256"] for file in provenance["files"]}
    assert manifest == {name: hashlib.sha256(data).hexdigest() for name, data in found.items()}
    return found


def beside(folder):
    return sorted(path.name for path in folder.parent.iterdir())


def write_old(folder):
    write_results(folder, OLD, "run", {"made": "old"})


def test_a_new_folder_holds_the_files_and_their_manifest(folder):
    write_results(folder, NEW, "run", {"started": "2027-04-01T00:00:00Z"})
    assert contents(folder) == NEW
    provenance = json.loads((folder / "provenance.json").read_text(encoding="utf-8"))
    assert provenance["command"] == "run"
    assert provenance["started"] == "2027-04-01T00:00:00Z"
    assert [file["name"] for file in provenance["files"]] == ["durations.csv", "figures/growth.png", "handoff.json"]
    assert beside(folder) == ["plan_results"]


def test_a_folder_is_replaced_whole(folder):
    write_old(folder)
    write_results(folder, NEW, "run", {})
    assert contents(folder) == NEW
    assert beside(folder) == ["plan_results"]


def test_an_empty_folder_is_filled(folder):
    folder.mkdir(parents=True)
    write_results(folder, NEW, "run", {})
    assert contents(folder) == NEW


def test_results_lacking_a_file_are_replaced(folder):
    write_old(folder)
    (folder / "cycles.csv").unlink()
    write_results(folder, NEW, "run", {})
    assert contents(folder) == NEW


def test_a_folder_given_by_a_link_is_replaced_and_the_link_stays(folder, tmp_path):
    write_old(folder)
    link = tmp_path / "link"
    link.symlink_to(folder, target_is_directory=True)
    write_results(link, NEW, "run", {})
    assert link.is_symlink()
    assert contents(folder) == NEW


def foreign_file(folder):
    (folder / "notes.txt").write_text("mine", encoding="utf-8")


def foreign_file_below(folder):
    (folder / "figures" / "sketch.svg").write_text("mine", encoding="utf-8")


def edited_file(folder):
    (folder / "durations.csv").write_bytes(b"old durations, 3 h more\n")


def link_instead_of_a_file(folder):
    (folder / "cycles.csv").rename(folder.parent / "elsewhere.csv")
    (folder / "cycles.csv").symlink_to(folder.parent / "elsewhere.csv")


def link_to_a_folder(folder):
    (folder / "more").symlink_to(folder.parent, target_is_directory=True)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (foreign_file, r"holds notes\.txt, which tidescour did not write: move it away, or give another folder"),
        (foreign_file_below, r"holds figures/sketch\.svg, which tidescour did not write"),
        (edited_file, r"durations\.csv was changed after tidescour wrote it: move it away to keep the change"),
        (link_instead_of_a_file, r"holds cycles\.csv, which tidescour did not write"),
        (link_to_a_folder, r"holds more, which tidescour did not write"),
    ],
)
def test_a_file_of_the_user_is_never_lost(folder, change, message):
    write_old(folder)
    change(folder)
    before = {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()}
    with pytest.raises(HandoffError, match=message):
        check_replaceable(folder, "run")
    with pytest.raises(HandoffError, match=message):
        write_results(folder, NEW, "run", {})
    assert {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()} == before
    assert not [name for name in beside(folder) if name.startswith("plan_results.")]


def test_a_folder_without_provenance_is_refused(folder):
    folder.mkdir(parents=True)
    (folder / "plan.toml").write_text("", encoding="utf-8")
    with pytest.raises(HandoffError, match=r"holds plan\.toml and no provenance\.json"):
        write_results(folder, NEW, "run", {})
    assert (folder / "plan.toml").exists()


@pytest.mark.parametrize("text", ["", "{", "[]", "{}", '{"files": [1], "command": "run"}', '{"files": [{}]}', "\xff"])
def test_an_unreadable_provenance_is_refused(folder, text):
    write_old(folder)
    (folder / "provenance.json").write_bytes(text.encode("latin-1"))
    with pytest.raises(HandoffError, match=r"provenance\.json does not list the files of the folder"):
        write_results(folder, NEW, "run", {})
    assert (folder / "durations.csv").read_bytes() == OLD["durations.csv"]


def test_results_that_cannot_be_read_are_refused_and_stand(folder):
    write_old(folder)
    (folder / "provenance.json").unlink()
    (folder / "provenance.json").mkdir()
    for refuse in (lambda: check_replaceable(folder, "run"), lambda: write_results(folder, {"a": b"1"}, "run", {})):
        with pytest.raises(HandoffError, match=r"cannot be written: .*provenance\.json.*stands as it was"):
            refuse()
    assert (folder / "provenance.json").is_dir()


def test_results_of_another_command_are_refused(folder):
    write_results(folder, OLD, "check", {})
    with pytest.raises(HandoffError, match="holds results of `tidescour check`, and this is `tidescour run`"):
        write_results(folder, NEW, "run", {})
    assert contents(folder) == OLD


def test_a_file_in_place_of_the_folder_is_refused(folder):
    folder.parent.mkdir()
    folder.write_text("mine", encoding="utf-8")
    with pytest.raises(HandoffError, match="is a file: give a folder for the results"):
        write_results(folder, NEW, "run", {})
    assert folder.read_text(encoding="utf-8") == "mine"
    assert beside(folder) == ["plan_results"]


def test_a_file_in_place_of_a_parent_is_refused(tmp_path):
    (tmp_path / "site").write_text("mine", encoding="utf-8")
    with pytest.raises(HandoffError, match="cannot be written"):
        write_results(tmp_path / "site" / "results", NEW, "run", {})


@pytest.mark.parametrize("name", ["/abs.csv", "../up.csv", "a/../b.csv", "a\\b.csv", "./a.csv", "provenance.json", ""])
def test_names_that_leave_the_folder_are_refused(folder, name):
    with pytest.raises(ValueError, match="cannot be the name of a result file"):
        write_results(folder, {name: b""}, "run", {})
    assert not folder.exists()


def refuse_call(monkeypatch, call, number, problem):
    """Let the given call of an `os` function fail."""
    original, calls = getattr(os, call), []

    def refusing(*arguments, **options):
        calls.append(arguments)
        if len(calls) == number:
            raise problem
        return original(*arguments, **options)

    monkeypatch.setattr(write.os, call, refusing)
    return calls


@pytest.mark.parametrize("number", [1, 2])
def test_old_results_stand_where_the_folder_is_locked(folder, monkeypatch, number):
    write_old(folder)
    refuse_call(monkeypatch, "rename", number, PermissionError(errno.EACCES, "in use", str(folder)))
    with pytest.raises(HandoffError, match=r"in use.*what was there before stands as it was.*close it there"):
        write_results(folder, NEW, "run", {})
    assert contents(folder) == OLD
    assert beside(folder) == ["plan_results"]


def test_old_results_stand_where_the_disk_is_full(folder, monkeypatch):
    write_old(folder)
    refuse_call(monkeypatch, "fsync", 2, OSError(errno.ENOSPC, "No space left on device"))
    with pytest.raises(HandoffError, match="No space left on device; what was there before stands"):
        write_results(folder, NEW, "run", {})
    assert contents(folder) == OLD
    assert beside(folder) == ["plan_results"]


def test_a_user_who_interrupts_gets_the_old_results(folder, monkeypatch):
    write_old(folder)
    refuse_call(monkeypatch, "fsync", 3, KeyboardInterrupt())
    with pytest.raises(KeyboardInterrupt):
        write_results(folder, NEW, "run", {})
    assert contents(folder) == OLD
    assert beside(folder) == ["plan_results"]


def test_new_results_stand_where_the_old_ones_cannot_be_removed_yet(folder, monkeypatch):
    write_old(folder)
    calls = refuse_call(monkeypatch, "rename", 3, PermissionError(errno.EACCES, "in use"))
    write_results(folder, NEW, "run", {})
    assert len(calls) == 3
    assert contents(folder) == NEW
    assert beside(folder) == ["plan_results", "plan_results.tidescour-previous"]
    write_results(folder, OLD, "run", {})
    assert contents(folder) == OLD
    assert beside(folder) == ["plan_results"]


def test_the_message_names_the_earlier_results_where_they_cannot_be_put_back(folder, monkeypatch):
    write_old(folder)
    original = os.rename

    def only_aside(source, target):
        if not str(target).endswith("-previous"):
            raise PermissionError(errno.EACCES, "in use", str(target))
        original(source, target)

    monkeypatch.setattr(write.os, "rename", only_aside)
    with pytest.raises(HandoffError, match=r"the earlier results are whole in .*tidescour-previous: rename it back"):
        write_results(folder, NEW, "run", {})
    monkeypatch.undo()
    recover_results(folder)
    assert contents(folder) == OLD


def test_an_edit_in_the_earlier_results_is_kept_after_a_kill(folder):
    write_old(folder)
    previous = folder.with_name(folder.name + ".tidescour-previous")
    folder.rename(previous)
    write_results(folder.parent / "other", NEW, "run", {})
    (folder.parent / "other").rename(folder)
    edited_file(previous)
    with pytest.raises(HandoffError, match=r"tidescour-previous: durations\.csv was changed"):
        write_results(folder, OLD, "run", {})
    assert contents(folder) == NEW
    assert (previous / "durations.csv").read_bytes() == b"old durations, 3 h more\n"


def test_a_folder_of_the_user_in_the_place_of_lost_results_keeps_both(folder):
    write_old(folder)
    previous = folder.with_name(folder.name + ".tidescour-previous")
    folder.rename(previous)
    folder.mkdir()
    foreign_file(folder)
    with pytest.raises(HandoffError, match=r"holds notes\.txt and no provenance\.json"):
        write_results(folder, NEW, "run", {})
    assert contents(previous) == OLD


def test_recovery_leaves_a_sound_folder_alone(folder):
    write_old(folder)
    recover_results(folder)
    assert contents(folder) == OLD
    recover_results(folder.parent / "nothing there")
    assert beside(folder) == ["plan_results"]


def killed(folder, step):
    """Write in a process of its own that dies at the given step; return whether it died."""
    done = subprocess.run([sys.executable, str(KILLER), str(folder), str(step)], check=False, capture_output=True)
    assert done.returncode in (0, 9), done.stderr.decode()
    return done.returncode == 9


@pytest.mark.parametrize("had_results", [True, False], ids=["over-old-results", "into-nothing"])
def test_results_are_whole_or_not_at_all_when_the_writer_is_killed_at_any_step(folder, had_results):
    step, seen = 0, set()
    folder.parent.mkdir()
    dies = True
    while dies:
        step += 1
        if had_results:
            write_old(folder)
        dies = killed(folder, step)
        if had_results:
            # Before anything is put right: whole results stand in the folder or, by a clear name, beside it.
            previous = folder.with_name(folder.name + ".tidescour-previous")
            assert contents(folder if folder.exists() else previous) in (OLD, NEW)
        recover_results(folder)
        now = contents(folder) if folder.exists() else None
        assert now in ((OLD, NEW) if had_results else (None, NEW))
        assert beside(folder) == ([] if now is None else ["plan_results"])
        seen.add("new" if now == NEW else "old")
        killed(folder, step)
        write_results(folder, NEW, "run", {})
        assert contents(folder) == NEW
        assert beside(folder) == ["plan_results"]
        for path in sorted(folder.rglob("*"), reverse=True):
            path.rmdir() if path.is_dir() else path.unlink()
        folder.rmdir()
    assert seen == {"old", "new"}
    assert step > 15
