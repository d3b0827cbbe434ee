"""Runs that are killed, for test_folder.py; started as a process of its own, which forks.

python swap_runs.py lines exchange|renames FOLDER   kill a run at each line that is no mere reading
python swap_runs.py first exchange|renames FOLDER   the same where there is no old result
python swap_runs.py random exchange|renames FOLDER SEED   kill 20 runs at random moments

Prints a JSON list: what was found after each kill.
"""

import json
import os
import random
import shutil
import signal
import sys
import time
from pathlib import Path

from hubdesign.exports import folder, swap

FILES = 3

# Functions that only read: killing a run in them tells nothing new.
READERS = {"_foreign_entries", "_check_apart", "lies_in", "_same", "_sha256", "read_manifest", "check_target"}


def write_result(target, word):
    with folder.claim_target(target) as claim, claim.new_result("design") as new:
        for number in range(FILES):
            (new / f"{number}.txt").write_text(f"{word} {number}")
        (new / "inputs").mkdir()
        (new / "inputs" / "a.csv").write_text(word)


def state_of(target):
    """Return the word of a whole result, "nothing", or what is wrong."""
    if not target.exists():
        return "nothing"
    if folder.changed_files(target):
        return f"broken: {folder.changed_files(target)}"
    words = {(target / f"{number}.txt").read_text().split()[0] for number in range(FILES)}
    words.add((target / "inputs" / "a.csv").read_text())
    return words.pop() if len(words) == 1 else f"mixed: {sorted(words)}"


def killed_at_line(target, word, line):
    """Run in a child that kills itself on its line-th line of our modules; return whether it was killed."""
    child = os.fork()
    if child == 0:
        left = [line]
        ours = {folder.__file__, swap.__file__, sys.modules["hubdesign.exports.lock"].__file__}

        def count(frame, event, _):
            if frame.f_code.co_filename not in ours or frame.f_code.co_name in READERS:
                return None
            if event == "line":
                left[0] -= 1
                if left[0] == 0:
                    os.kill(os.getpid(), signal.SIGKILL)
            return count

        sys.settrace(count)
        write_result(target, word)
        os._exit(0)
    return os.WIFSIGNALED(os.waitpid(child, 0)[1])


def after_kill(target):
    """Return the state as it stands, after repair, and whether the next run goes through and clears up."""
    raw = state_of(target)
    folder.repair(target)
    repaired = state_of(target)
    write_result(target, "old")
    leftovers = sorted(entry.name for entry in target.parent.iterdir() if entry != target)
    return [raw, repaired, state_of(target), leftovers]


def every_line(home, old_result):
    found, line = [], 0
    target = home / "result"
    write_result(target, "old")
    while True:
        line += 1
        if not old_result:
            shutil.rmtree(target)
        if not killed_at_line(target, "new", line):
            return found
        found.append(after_kill(target))


def at_random(home, seed):
    found, target, rng = [], home / "result", random.Random(seed)
    started = time.perf_counter()
    write_result(target, "old")
    length = time.perf_counter() - started
    for _ in range(20):
        child = os.fork()
        if child == 0:
            while True:
                write_result(target, "new")
                write_result(target, "old")
        time.sleep(rng.uniform(0.0, 6.0 * length))
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        found.append(after_kill(target))
    return found


if __name__ == "__main__":
    what, way, home = sys.argv[1], sys.argv[2], Path(sys.argv[3])
    if way == "renames":
        swap.exchange = lambda first, second: False
    kills = at_random(home, int(sys.argv[4])) if what == "random" else every_line(home, what == "lines")
    print(json.dumps(kills))
