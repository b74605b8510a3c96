"""A sweep whose disk is full: exit 3 and one clear line, no torn rows, and it goes on once there is room."""
import json
import os
import pathlib
import resource
import shutil
import subprocess
import tempfile
import time
import unittest

from sweeps import Bench, database, drawn, rows

PLAN = drawn(3000)  # more than half a megabyte of rows
SLOW = ("--threads", 1, "--isa", "double")  # so that the first batch fits on any processor


class FullDisk(unittest.TestCase):
    def check(self, bench, store, limited, more_room):
        bench.sweep("--store", "undisturbed")
        wanted = rows(bench.path / "undisturbed")

        def fails():
            text = bench.sweep("--store", store, *SLOW, status=3, preexec_fn=limited)
            self.assertEqual(text.count("\n"), 1, text)
            self.assertIn(f"cannot write to the store '{store}'", text)
            return text

        first = fails()
        # What is on the disk, read from a copy, as SQLite needs room itself.
        for end in ("", "-wal"):
            if pathlib.Path(str(bench.path / store) + end).exists():
                shutil.copy(str(bench.path / store) + end, bench.path / ("copy" + end))
        with database(bench.path / "copy") as db:
            self.assertEqual(db.execute("PRAGMA integrity_check").fetchall(), [("ok",)])
        kept = rows(bench.path / "copy")
        self.assertTrue(0 < len(kept) < len(wanted), len(kept))
        self.assertLessEqual(set(kept), set(wanted))
        again = fails()  # still no room: it says so again, and does no harm
        self.assertEqual(first, again)
        more_room()
        said = json.loads(bench.sweep("--store", store, "--json"))
        self.assertGreater(said["resumed"], 0)
        self.assertEqual(rows(bench.path / store), wanted)
        return first

    def test_tmpfs(self):
        if os.geteuid() != 0:
            self.skipTest("needs root to mount a small tmpfs; the limit of a file's size is tested instead")
        bench = Bench(self, PLAN)
        disk = self.mounted("3m")
        filler = disk / "filler"
        filler.write_bytes(b"x" * (3 * 1024 * 1024 - 500 * 1024))
        said = self.check(bench, str(disk / "s.sqlite"), None, filler.unlink)
        self.assertIn("the disk is full; make room, and the same command goes on where it stopped", said)

    def test_read_only_disk(self):
        if os.geteuid() != 0:
            self.skipTest("needs root to mount a small tmpfs")
        bench = Bench(self, drawn(5))
        disk = self.mounted("4m")
        bench.sweep("--store", disk / "s.sqlite")
        wanted = rows(disk / "s.sqlite")
        # Left by a kill: rows wait in its WAL.
        process = bench.start("--store", disk / "cut.sqlite", "--set", "run.duration_s=500.0")
        while not (disk / "cut.sqlite-wal").exists() or (disk / "cut.sqlite-wal").stat().st_size == 0:
            time.sleep(0.01)
        process.kill()
        process.communicate()
        subprocess.run(["mount", "-o", "remount,ro", disk], check=True)
        for store in ("s.sqlite", "new.sqlite"):
            text = bench.sweep("--store", disk / store, status=3)
            self.assertEqual(text, f"cannot open the store '{disk / store}': the folder '{disk}' cannot be written to "
                             "(Read-only file system)\n")
        said = json.loads(bench.sweep("--store", "whole", "--merge", disk / "s.sqlite", "--json"))
        self.assertEqual(said["merged"], {"rows": 5, "twice": 0, "missing": 0})
        self.assertEqual(bench.rows("whole"), wanted)
        text = bench.sweep("--store", "cut", "--set", "run.duration_s=500.0", "--merge", disk / "cut.sqlite", status=3)
        self.assertIn("cannot be written to", text)

    def mounted(self, size):
        disk = pathlib.Path(tempfile.mkdtemp(prefix="slipdisk"))
        self.addCleanup(shutil.rmtree, disk, ignore_errors=True)
        done = subprocess.run(["mount", "-t", "tmpfs", "-o", f"size={size}", "tmpfs", disk], capture_output=True, text=True)
        if done.returncode != 0:
            self.skipTest(f"cannot mount a tmpfs here: {done.stderr.strip()}")
        self.addCleanup(subprocess.run, ["umount", disk], check=True)
        return disk

    def test_disk_without_any_room(self):
        if not os.path.exists("/dev/full"):
            self.skipTest("no /dev/full")
        bench = Bench(self, drawn(5))
        text = bench.sweep("--store", "s", "--csv", "/dev/full", status=3)
        self.assertEqual(text.count("\n"), 1, text)
        self.assertIn("/dev/full", text)
        self.assertEqual(len(bench.rows("s")), 5)  # the store has them all the same

    def test_limit_of_file_size(self):
        bench = Bench(self, PLAN)
        limit = 250 * 1024
        said = self.check(bench, "s.sqlite", lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit)), lambda: None)
        self.assertIn("ulimit -f", said)


if __name__ == "__main__":
    unittest.main()
