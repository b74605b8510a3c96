"""Sweeps on a real Slurm of two nodes, on loopback: the same rows as a local sweep, whatever is killed, and nothing left behind.

    test_slurm.py SLIPBENCH

Needs root (the daemons do); else it is skipped with exit status 77.
"""
import json
import os
import pathlib
import shutil
import signal
import subprocess
import sys
import tempfile
import time

HERE = pathlib.Path(__file__).resolve().parent
SOURCE = HERE.parents[3]
PATIENCE = 180  # s: a requeued job alone waits 5 s for its credential, several times over

# Six units of 64 cases, each some seconds of one processor: time enough to get in the way.
PLAN = """scenario = "drive.toml"
runs = 2
[[vary]]
key = "belief.rotor_resistance"
from = 0.7
to = 1.5
count = 16
[[vary]]
key = "belief.stator_resistance"
from = 0.7
to = 1.5
count = 12
"""
SHARDS = 6


def wait_for(what, condition, patience=PATIENCE):
    until = time.monotonic() + patience
    while time.monotonic() < until:
        found = condition()
        if found:
            return found
        time.sleep(0.05)
    raise AssertionError(f"waited {patience} s for {what}")


def environment_of(pid):
    try:
        pairs = pathlib.Path(f"/proc/{pid}/environ").read_bytes().split(b"\0")
    except OSError:
        return {}
    return dict(pair.decode(errors="replace").partition("=")[::2] for pair in pairs)


class Trial:
    def __init__(self, slipbench, folder):
        self.slipbench, self.folder = slipbench, folder
        self.lb = {**os.environ, "SLURM_LB_DIR": f"/tmp/slipbench_lb.{os.getpid()}"}
        self.conf = f"{self.lb['SLURM_LB_DIR']}/slurm.conf"
        self.env = {**os.environ, "SLURM_CONF": self.conf}

    def loopback(self, word):
        subprocess.run([HERE / "loopback.sh", word], env=self.lb, check=True, timeout=120)

    def command(self, *words):
        return subprocess.run(words, env=self.env, capture_output=True, text=True, timeout=60)

    def queue(self):
        return self.command("squeue", "-h", "-r", "-o", "%i %T").stdout.split("\n")[:-1]

    def start(self, store, *more, shards=SHARDS):
        words = [self.slipbench, "sweep", "plan.toml", "--on", "slurm", "--shards", str(shards), "--store", store,
                 "--csv", store + ".csv", "--json", *more]
        return subprocess.Popen(words, cwd=self.folder, env=self.env, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)

    @staticmethod
    def end(process, status):
        out, err = process.communicate(timeout=PATIENCE)
        assert process.returncode == status, (process.returncode, out, err)
        return json.loads(out), err

    def tasks(self):
        """(pid, shard) of the shards' own programs, as they run."""
        found = []
        for entry in pathlib.Path("/proc").iterdir():
            if not entry.name.isdigit():
                continue
            try:
                words = (entry / "cmdline").read_bytes().split(b"\0")
            except OSError:
                continue
            if b"--shard" in words and environment_of(entry.name).get("SLURM_CONF") == self.conf:
                found.append((int(entry.name), words[words.index(b"--shard") + 1].decode()))
        return found

    def left_over(self):
        return [p for p in os.listdir("/proc") if p.isdigit() and environment_of(p).get("SLURM_CONF") == self.conf
                and int(p) != os.getpid()]

    def same_rows(self, store):
        local, ours = ((self.folder / name).read_bytes() for name in ("local.sqlite.csv", store + ".csv"))
        assert local.count(b"\n") == 385
        assert ours == local, f"{store}: other rows than the local sweep's"

    def nothing_left(self, store):
        assert not self.queue(), self.queue()
        assert not (self.folder / (store + ".shards")).exists()
        assert not self.tasks()

    # --- trials -------------------------------------------------------------------------------------------------------------

    def undisturbed(self):
        document, _ = self.end(self.start("a.sqlite", "--slurm", "partition=main", "--slurm", "time=10", "--threads", "2"), 0)
        assert document["slurm"] == {"shards": SHARDS, "submitted": SHARDS, "lost": 0}, document["slurm"]
        self.same_rows("a.sqlite")
        self.nothing_left("a.sqlite")
        # All is there: nothing is submitted.
        document, _ = self.end(self.start("a.sqlite"), 0)
        assert document["slurm"]["submitted"] == 0
        self.same_rows("a.sqlite")

    def killed_task_and_lost_node(self):
        sweep = self.start("b.sqlite", shards=4)
        # On the node that stays: one that ends on a node which goes down is put back by Slurm itself.
        on_n1 = lambda: [t for t in self.tasks() if environment_of(t[0]).get("SLURMD_NODENAME") == "n1"]
        pid, shard = wait_for("a task on n1", on_n1)[0]
        wait_for("its first rows", lambda: list((self.folder / "b.sqlite.shards").glob("*.partial")))
        os.kill(pid, signal.SIGKILL)
        print(f"  killed the program of shard {shard}")
        wait_for("a task on n2", lambda: "RUNNING" in self.command("squeue", "-h", "-w", "n2", "-o", "%T").stdout)
        self.command("scontrol", "update", "NodeName=n2", "State=DOWN", "Reason=test")
        print("  node n2 is down")
        document, _ = self.end(sweep, 0)
        assert document["slurm"]["lost"] >= 1, document["slurm"]
        self.command("scontrol", "update", "NodeName=n2", "State=RESUME")
        self.same_rows("b.sqlite")
        self.nothing_left("b.sqlite")

    def interrupted(self):
        sweep = self.start("c.sqlite")
        wait_for("a task", self.tasks)
        second = self.start("c.sqlite")
        out, err = second.communicate(timeout=60)
        assert second.returncode == 3 and "in use by another process" in err, (second.returncode, err)
        # Four tasks run at a time: with one of six finished others are still to come.
        wait_for("a finished shard", lambda: list((self.folder / "c.sqlite.shards").glob("*-of-6.sqlite")))
        sweep.send_signal(signal.SIGINT)
        document, _ = self.end(sweep, 130)
        assert document["interrupted"]
        assert not self.queue(), self.queue()
        assert not self.tasks()
        left = [p.name for p in (self.folder / "c.sqlite.shards").iterdir()]
        assert left and all(".sqlite" in name or ".partial" in name for name in left), left
        document, _ = self.end(self.start("c.sqlite"), 0)
        assert 0 < document["slurm"]["submitted"] < SHARDS, document["slurm"]
        self.same_rows("c.sqlite")
        self.nothing_left("c.sqlite")

    def follower_killed(self):
        sweep = self.start("d.sqlite")
        wait_for("a task", self.tasks)
        wait_for("the job's number", (self.folder / "d.sqlite.shards" / "jobs").exists)
        sweep.kill()
        sweep.communicate()
        assert self.queue()  # the array goes on by itself
        document, _ = self.end(self.start("d.sqlite"), 0)
        assert document["slurm"]["submitted"] == 0, document["slurm"]
        self.same_rows("d.sqlite")
        self.nothing_left("d.sqlite")

    def lost_too_often(self):
        """A shard whose program always dies is started four times, then told of."""
        sweep = self.start("e.sqlite", shards=1)
        killed = set()
        while sweep.poll() is None:
            for pid, _ in self.tasks():
                if pid not in killed:
                    os.kill(pid, signal.SIGKILL)
                    killed.add(pid)
            time.sleep(0.05)
        document, err = self.end(sweep, 3)
        assert "lost 4 times" in document["error"]["message"], document
        assert len(killed) == 4, killed
        assert not self.queue(), self.queue()
        document, _ = self.end(self.start("e.sqlite", shards=1), 0)
        self.same_rows("e.sqlite")
        self.nothing_left("e.sqlite")

    def failing(self):
        """What starting again would not help is told at once, with the log's end."""
        scenario = self.folder / "drive.toml"
        sweep = self.start("f.sqlite", "--slurm", "hold")
        job = wait_for("the held array", self.queue)[0].split("_")[0]
        scenario.rename(self.folder / "away.toml")
        self.command("scontrol", "release", job)
        document, err = self.end(sweep, 3)
        (self.folder / "away.toml").rename(scenario)
        assert "failed; its log ends with" in err and "drive.toml" in err, err
        assert not self.queue(), self.queue()
        document, err = self.end(self.start("g.sqlite", "--slurm", "partition=nowhere"), 3)
        assert "sbatch refused the array" in err and "partition" in err, err
        self.nothing_left("g.sqlite")


def main():
    if os.geteuid() != 0:
        print("SKIPPED: a Slurm of one's own needs root")
        return 77
    slipbench = str(pathlib.Path(sys.argv[1]).resolve())
    folder = pathlib.Path(tempfile.mkdtemp(prefix="slipbench-slurm-"))
    trial = Trial(slipbench, folder)
    try:
        text = (SOURCE / "tests/tools/command.hpp").read_text()
        text = text[text.index('R"(') + 3:]
        text = text[:text.index(')";')].replace("duration_s = 0.3", "duration_s = 6.0")
        (folder / "drive.toml").write_text(text)
        (folder / "plan.toml").write_text(PLAN)
        subprocess.run([slipbench, "sweep", "plan.toml", "--store", "local.sqlite", "--csv", "local.sqlite.csv", "--quiet"],
                       cwd=folder, check=True)
        trial.loopback("start")
        for one in (trial.undisturbed, trial.killed_task_and_lost_node, trial.interrupted, trial.follower_killed,
                    trial.lost_too_often, trial.failing):
            begun = time.monotonic()
            print(f"{one.__name__} ...", flush=True)
            one()
            print(f"{one.__name__}: {time.monotonic() - begun:.1f} s", flush=True)
    finally:
        trial.loopback("stop")
        shutil.rmtree(folder, ignore_errors=True)
    left = trial.left_over()
    assert not left, f"still running: {left}"
    return 0


if __name__ == "__main__":
    for number in (signal.SIGTERM, signal.SIGHUP):  # so that `finally` ends the daemons
        signal.signal(number, lambda n, _: sys.exit(128 + n))
    sys.exit(main())
