"""A result folder is the old one or the new one, whole, and never somebody else's."""

import errno
import json
import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

import pytest

from hubdesign.errors import OutputError
from hubdesign.exports import folder as folder_module
from hubdesign.exports import lock, swap
from hubdesign.exports.folder import changed_files, check_target, claim_target, read_manifest, repair

RUNS = Path(__file__).with_name("swap_runs.py")


def write_result(target, word, inputs=None, then=lambda new: None):
    with claim_target(target, inputs) as claim, claim.new_result("design") as new:
        (new / "a.csv").write_text(word)
        (new / "inputs").mkdir()
        (new / "inputs" / "b.csv").write_text(word)
        then(new)


def read_result(target):
    assert changed_files(target) == []
    return (target / "a.csv").read_text()


def names_beside(target):
    return sorted(entry.name for entry in target.parent.iterdir())


@pytest.fixture
def target(tmp_path):
    return tmp_path / "home" / "result"


@pytest.fixture
def memory(tmp_path):
    """A folder in memory where there is one: hundreds of syncs take their time on a disk."""
    shared = Path("/dev/shm")
    if not os.access(shared, os.W_OK):
        yield tmp_path
        return
    with tempfile.TemporaryDirectory(dir=shared) as home:
        yield Path(home)


def test_a_result_is_written_replaced_and_listed_with_its_hashes(target):
    write_result(target, "first")
    write_result(target, "second")
    assert read_result(target) == "second"
    manifest = read_manifest(target)
    assert manifest.kind == "design"
    # SHA-256 of "second", from coreutils' sha256sum.
    assert manifest.files["a.csv"] == "16367aacb67a4a017c8da8ab95682ccb390863780f7114dda0a0e0c55644c7c4"
    assert sorted(manifest.files) == ["a.csv", "inputs/b.csv"]
    assert names_beside(target) == ["result"]


def test_a_result_takes_the_place_of_an_empty_folder_and_keeps_the_usual_rights(target):
    target.mkdir(parents=True)
    usual = target.stat().st_mode
    write_result(target, "first")
    assert read_result(target) == "first"
    assert target.stat().st_mode == usual


def test_a_failed_run_leaves_the_old_result_and_nothing_beside_it(target):
    write_result(target, "first")

    def fail(new):
        raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        write_result(target, "half", then=fail)
    assert read_result(target) == "first"
    assert names_beside(target) == ["result"]


def test_a_claim_without_a_result_leaves_no_trace(target):
    with claim_target(target / "deeper" / "still"):
        pass
    assert not target.parent.exists()


def test_a_fault_in_the_work_is_not_taken_for_a_fault_of_the_folder(target):
    with pytest.raises(FileNotFoundError) as caught, claim_target(target):
        (target / "not-there").read_text()
    assert not isinstance(caught.value, OutputError)


@pytest.mark.parametrize(
    "name", ["notes.txt", ".hidden", "inputs/more.csv", "extra/", "inputs/extra/deep.csv"]
)
def test_a_result_with_a_foreign_file_is_refused_and_kept(target, name):
    write_result(target, "first")
    if name.endswith("/"):
        (target / name).mkdir()
    else:
        (target / name).parent.mkdir(exist_ok=True)
        (target / name).write_text("mine")
    with pytest.raises(OutputError, match=r"not a result of hubdesign"):
        write_result(target, "second")
    assert (target / "a.csv").read_text() == "first"
    assert (target / name).exists()


@pytest.mark.parametrize("manifest", [None, "{}", "[]", "not json", '{"tool": "other", "files": {"a": "b"}}'])
def test_a_folder_of_somebody_else_is_refused(target, manifest):
    target.mkdir(parents=True)
    (target / "thesis.tex").write_text("years of work")
    if manifest is not None:
        (target / "manifest.json").write_text(manifest)
    with pytest.raises(OutputError, match=r"thesis\.tex"):
        check_target(target)
    with pytest.raises(OutputError):
        write_result(target, "first")
    assert (target / "thesis.tex").read_text() == "years of work"


def test_a_link_inside_a_result_is_foreign_and_what_it_points_to_is_safe(target, tmp_path):
    write_result(target, "first")
    (tmp_path / "precious").mkdir()
    (tmp_path / "precious" / "file").write_text("kept")
    shutil.rmtree(target / "inputs")
    (target / "inputs").symlink_to(tmp_path / "precious")
    with pytest.raises(OutputError, match="inputs/"):
        write_result(target, "second")
    assert (tmp_path / "precious" / "file").read_text() == "kept"


def test_a_link_to_a_result_is_followed(target, tmp_path):
    write_result(target, "first")
    (tmp_path / "link").symlink_to(target)
    write_result(tmp_path / "link", "second")
    assert read_result(target) == "second"
    assert (tmp_path / "link").is_symlink()


@pytest.mark.parametrize(
    ("place", "reason"),
    [
        ("case", "is the inputs themselves"),
        ("case/out", "lies inside the inputs"),
        ("case/deep/er/out", "lies inside the inputs"),
        (".", "holds the inputs"),
        ("other/../case", "is the inputs themselves"),
        ("alias", "is the inputs themselves"),
    ],
)
def test_a_target_that_touches_the_inputs_is_refused(tmp_path, place, reason):
    home = tmp_path / "home"
    (home / "case").mkdir(parents=True)
    (home / "other").mkdir()
    (home / "case" / "stations.csv").write_text("station")
    (home / "alias").symlink_to(home / "case")
    with pytest.raises(OutputError, match=reason):
        check_target(home / place, home / "case")
    with pytest.raises(OutputError, match=reason):
        write_result(home / place, "first", home / "case")
    assert (home / "case" / "stations.csv").read_text() == "station"


def test_a_workbook_counts_as_inputs_too(tmp_path):
    (tmp_path / "case.xlsx").write_text("")
    with pytest.raises(OutputError, match="holds the inputs"):
        check_target(tmp_path, tmp_path / "case.xlsx")
    with pytest.raises(OutputError, match="is the inputs themselves"):
        check_target(tmp_path / "case.xlsx", tmp_path / "case.xlsx")


def test_a_file_in_the_way_is_refused(tmp_path):
    (tmp_path / "file").write_text("mine")
    for place in (tmp_path / "file", tmp_path / "file" / "out"):
        with pytest.raises(OutputError, match="is a file"):
            check_target(place)
    assert (tmp_path / "file").read_text() == "mine"


def test_the_folder_one_stands_in_is_refused(tmp_path, monkeypatch):
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    for place in (".", ".."):
        with pytest.raises(OutputError, match="the folder you are in"):
            check_target(place)


def test_a_file_put_there_during_the_run_is_kept(target):
    write_result(target, "first")
    with pytest.raises(OutputError, match="late"):
        write_result(target, "second", then=lambda new: (target / "late.txt").write_text("mine"))
    assert (target / "a.csv").read_text() == "first"
    assert names_beside(target) == ["result"]


def test_a_second_run_into_one_target_is_refused_while_the_first_one_works(target):
    code = (
        "import sys; from hubdesign.exports.folder import claim_target\n"
        "with claim_target(sys.argv[1]):\n    print('held', flush=True); sys.stdin.read()"
    )
    first = subprocess.Popen(
        [sys.executable, "-c", code, str(target)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    )
    try:
        assert first.stdout.readline() == "held\n"
        with pytest.raises(OutputError, match="another run is writing there"):
            write_result(target, "second")
        write_result(target.with_name("neighbour"), "free")
        assert not target.exists()
    finally:
        first.communicate()
    write_result(target, "third")
    assert read_result(target) == "third"


def test_without_posix_locks_a_second_run_is_refused_too(target, monkeypatch):
    monkeypatch.setattr(lock, "fcntl", None)
    with claim_target(target), pytest.raises(OutputError, match="another run"), claim_target(target):
        pass
    write_result(target, "first")
    assert names_beside(target) == ["result"]


@pytest.mark.parametrize("code", [errno.ENOSPC, errno.EDQUOT])
@pytest.mark.parametrize("call", ["mkdir", "fsync"])
def test_a_full_disk_is_said_and_keeps_the_old_result(target, monkeypatch, code, call):
    write_result(target, "first")

    def full(*_args, **_kwargs):
        raise OSError(code, os.strerror(code), "somewhere")

    monkeypatch.setattr(os, call, full)
    with pytest.raises(OutputError, match=r"the disk is full.*the old result is kept"):
        write_result(target, "second")
    monkeypatch.undo()
    assert read_result(target) == "first"
    assert names_beside(target) == ["result"]


def test_a_full_disk_met_while_the_files_are_written_is_said(target):
    write_result(target, "first")
    with pytest.raises(OutputError, match="the disk is full"):
        write_result(target, "second", then=lambda new: Path("/dev/full").write_text("x" * 10_000))
    assert read_result(target) == "first"


def on_a_small_disk(disk, code):
    """Run `code` with a memory disk of 128 kB at `disk`, in its own mount namespace; return its lines."""
    if shutil.which("unshare") is None:
        pytest.skip("no unshare command: a small disk cannot be mounted")
    disk.mkdir()
    head = (
        f"import os, subprocess, sys; sys.path.insert(0, {str(RUNS.parent)!r})\n"
        "from pathlib import Path\nfrom hubdesign.errors import OutputError\n"
        "from hubdesign.exports.folder import claim_target\nfrom swap_runs import state_of, write_result\n"
        f"disk = Path({str(disk)!r}); target = disk / 'result'\nwrite_result(target, 'old')\n"
    )
    mount = 'mount -t tmpfs -o size=128k none "$2" && exec "$0" -c "$1"'
    command = [
        "unshare",
        "--map-root-user",
        "--mount",
        "sh",
        "-c",
        mount,
        sys.executable,
        head + code,
        str(disk),
    ]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    if done.returncode != 0 and "Traceback" not in done.stderr:
        pytest.skip(f"a small disk cannot be mounted here: {done.stderr.strip()}")
    assert done.returncode == 0, done.stderr
    return done.stdout.splitlines()


def test_a_disk_that_is_really_full_keeps_the_old_result(tmp_path):
    code = (
        "try:\n"
        "    with claim_target(target) as claim, claim.new_result('design') as new:\n"
        "        (new / 'big').write_bytes(bytes(1_000_000))\n"
        "except OutputError as error:\n    print(error)\n"
        "print(state_of(target), sorted(entry.name for entry in disk.iterdir()))\n"
    )
    said, state = on_a_small_disk(tmp_path / "disk", code)
    assert "the disk is full" in said
    assert "the old result is kept" in said
    assert state == "old ['result']"


def test_a_disk_that_is_really_read_only_is_said_before_any_work(tmp_path):
    code = (
        "subprocess.run(['mount', '-o', 'remount,ro', str(disk)], check=True)\n"
        "for place in (target, disk / 'new'):\n"
        "    try:\n"
        "        with claim_target(place):\n            print('work')\n"
        "    except OutputError as error:\n        print(error)\n"
        "print(state_of(target))\n"
    )
    old, new, state = on_a_small_disk(tmp_path / "disk", code)
    assert "may not be written (Read-only file system" in old
    assert old.endswith("the old result is kept")
    assert new.endswith("nothing was written")
    assert state == "old"


def test_a_place_that_may_not_be_written_is_said(target, monkeypatch):
    write_result(target, "first")

    def refused(path, *_args, **_kwargs):
        raise PermissionError(errno.EACCES, "Permission denied", str(path))

    monkeypatch.setattr(os, "open", refused)
    with pytest.raises(OutputError, match=r"may not be written \(Permission denied"):
        write_result(target, "second")
    monkeypatch.undo()
    assert read_result(target) == "first"


@pytest.mark.skipif(os.name == "posix" and os.geteuid() == 0, reason="rights do not bind the superuser")
def test_a_read_only_place_is_said(target):
    write_result(target, "first")
    target.parent.chmod(0o555)
    try:
        with pytest.raises(OutputError, match="may not be written"):
            write_result(target, "second")
    finally:
        target.parent.chmod(0o755)
    assert read_result(target) == "first"


def test_where_names_cannot_be_exchanged_two_renames_do(target, monkeypatch):
    monkeypatch.setattr(swap, "exchange", lambda first, second: False)
    write_result(target, "first")
    write_result(target, "second")
    assert read_result(target) == "second"
    assert names_beside(target) == ["result"]


@pytest.mark.parametrize("failing", [1, 2])
def test_a_rename_that_fails_brings_the_old_result_back(target, monkeypatch, failing):
    write_result(target, "first")
    calls, rename = [], os.rename

    def sometimes(source, goal):
        calls.append(goal)
        if len(calls) == failing:
            raise OSError(errno.EIO, "Input/output error", str(goal))
        rename(source, goal)

    monkeypatch.setattr(swap, "exchange", lambda first, second: False)
    monkeypatch.setattr(os, "rename", sometimes)
    with pytest.raises(OutputError, match="the old result is kept"):
        write_result(target, "second")
    assert read_result(target) == "first"
    assert names_beside(target) == ["result"]


def test_the_system_s_exchange_is_used_where_it_exists(tmp_path):
    (tmp_path / "a").mkdir()
    (tmp_path / "b").mkdir()
    (tmp_path / "a" / "was-a").write_text("")
    done = swap.exchange(tmp_path / "a", tmp_path / "b")
    if not done:
        assert (tmp_path / "a" / "was-a").exists()
        pytest.skip("neither this system nor this file system can exchange two names")
    assert (tmp_path / "b" / "was-a").exists()
    with pytest.raises(OSError, match="No such file"):
        swap.exchange(tmp_path / "a", tmp_path / "missing")


def test_a_record_that_names_other_folders_touches_none_of_them(target, tmp_path):
    write_result(target, "first")
    (tmp_path / "precious").mkdir()
    record = swap.record_of(target)
    record.write_text(json.dumps({"new": "../precious", "old": "../precious"}))
    repair(target)
    assert (tmp_path / "precious").exists()
    assert not record.exists()
    assert read_result(target) == "first"


def test_leftovers_of_dead_runs_go_and_those_of_other_targets_stay(target):
    target.parent.mkdir(parents=True)
    stale = target.parent / ".result.hubdesign-new-0123abcd"
    other = target.parent / ".result.hubdesign-x.hubdesign-new-0123abcd"
    for place in (stale, other):
        place.mkdir()
        (place / "half").write_text("")
    write_result(target, "first")
    assert not stale.exists()
    assert other.exists()


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
@pytest.mark.parametrize("way", ["exchange", "renames"])
def test_a_run_killed_at_any_line_leaves_the_old_result_or_the_new_one(memory, way):
    found = json.loads(_run("lines", way, memory))
    assert len(found) > 80
    for raw, repaired, after, leftovers in found:
        assert repaired in ("old", "new")
        assert raw == repaired if way == "exchange" else raw in (repaired, "nothing")
        assert (after, leftovers) == ("old", [])
    assert {row[1] for row in found} == {"old", "new"}
    if way == "renames":
        assert any(row[0] == "nothing" for row in found), "the moment between two renames was not met"


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
def test_a_first_run_killed_at_any_line_leaves_nothing_or_the_whole_result(memory):
    found = json.loads(_run("first", "exchange", memory))
    assert len(found) > 80
    for raw, repaired, after, leftovers in found:
        assert raw == repaired
        assert raw in ("nothing", "new")
        assert (after, leftovers) == ("old", [])
    assert {row[1] for row in found} == {"nothing", "new"}


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
@pytest.mark.parametrize("way", ["exchange", "renames"])
def test_runs_killed_at_random_leave_a_whole_result(tmp_path, way):
    found = json.loads(_run("random", way, tmp_path, "1"))
    assert len(found) == 20
    for raw, repaired, after, leftovers in found:
        assert repaired in ("old", "new")
        assert raw == repaired or (way == "renames" and raw == "nothing")
        assert (after, leftovers) == ("old", [])


def _run(*arguments):
    root = Path(folder_module.__file__).parents[2]
    done = subprocess.run(
        [sys.executable, str(RUNS), *map(str, arguments)],
        capture_output=True,
        text=True,
        check=False,
        env={**os.environ, "PYTHONPATH": str(root)},
    )
    assert done.returncode == 0, done.stderr
    return done.stdout
