"""Write a result folder and die at the given step: python kill_writer.py FOLDER STEP; exit code 9 when killed.

A step is a call that reaches the file system. Killed in `fsync`, a file is left half written.
"""

import os
import stat
import sys
from pathlib import Path

from tidescour.handoff.write import write_results

CALLS = ("open", "os.mkdir", "os.rename", "os.remove", "os.rmdir", "os.scandir", "os.listdir", "shutil.rmtree")


def main(folder, deadly):
    calls = 0
    sync = os.fsync

    def dies_now():
        nonlocal calls
        calls += 1
        return calls == deadly

    def die_before(event, _arguments):
        if event in CALLS and dies_now():
            os._exit(9)

    def torn_sync(descriptor):
        if dies_now():
            status = os.fstat(descriptor)
            if stat.S_ISREG(status.st_mode):
                os.ftruncate(descriptor, status.st_size // 2)
            os._exit(9)
        sync(descriptor)

    os.fsync = torn_sync
    files = {"durations.csv": b"new durations\n", "figures/growth.png": b"new picture", "handoff.json": b"{}\n"}
    sys.addaudithook(die_before)
    write_results(Path(folder), files, "run", {"made": "new"})


main(sys.argv[1], int(sys.argv[2]))
