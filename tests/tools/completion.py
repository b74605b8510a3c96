"""Runs the completion scripts in the shells themselves: bash's function with words laid out as the shell does, then both
shells at a terminal, typing and pressing Tab.

usage: completion.py SOURCE SLIPBENCH
"""
import fcntl
import json
import os
import pathlib
import pty
import re
import select
import struct
import subprocess
import sys
import tempfile
import termios
import time

slipbench = pathlib.Path(sys.argv[2]).resolve()
failures = []


def output(*arguments):
    return subprocess.run([slipbench, *arguments], capture_output=True, text=True, check=True).stdout


def check(what, holds, seen=""):
    if not holds:
        failures.append(what)
        print(f"FAILED: {what}\n  saw: {seen!r}")


def options_of(verb):
    """From --help: what a reader is told."""
    return set(re.findall(r"^  (?:-h,)?(--[a-z-]+)", output(verb, "--help"), re.M))


keys = json.loads(output("check", "--keys", "--json"))["keys"]
key_names = {key["key"].replace("[]", ".0") for key in keys}
verbs = set(re.findall(r"^  ([a-z]+)  ", output("--help").split("Subcommands:")[1].split("\n\n")[0], re.M))
options = {verb: options_of(verb) for verb in verbs}
check("help lists verbs and options", {"run", "check", "compare"} <= verbs and "--trace" in options["run"], (verbs, options))


def bash(folder, *words):
    """COMPREPLY with the cursor at the end of the last word."""
    script = ('source "$1"; shift; COMP_WORDS=("$@"); COMP_CWORD=$(($# - 1)); _slipbench; '
              'printf "%s\\n" "${COMPREPLY[@]}"')
    result = subprocess.run(["bash", "--norc", "-c", script, "bash", folder / "slipbench.bash", "slipbench", *words],
                            cwd=folder, capture_output=True, text=True)
    check(f"bash says nothing on standard error for {words}", result.stderr == "", result.stderr)
    return set(result.stdout.split("\n")) - {""}


def bash_function(folder):
    files = {"a.toml", "b c.toml", "sub"}
    check("bash: verbs first", verbs <= bash(folder, "") and "--man" in bash(folder, ""), bash(folder, ""))
    check("bash: ru", bash(folder, "ru") == {"run"}, bash(folder, "ru"))
    for verb in verbs:
        check(f"bash: options of {verb} and no others", bash(folder, verb, "--") == options[verb], bash(folder, verb, "--"))
        check(f"bash: FILE of {verb}", bash(folder, verb, "") == files, bash(folder, verb, ""))
    after_file = bash(folder, "run", "a.toml", "--tr")
    check("bash: options after FILE", after_file == {"--trace"}, after_file)
    for words, wanted in {
        ("run", "a.toml", "--trace", ""): {"t.csv", "sub"},
        ("run", "a.toml", "--trace", "=", ""): {"t.csv", "sub"},
        ("run", "a.toml", "--trace", "="): {"t.csv", "sub"},
        ("run", "a.toml", "--figure", "f"): {"f.svg"},
        ("run", "a.toml", "--seed", ""): set(),
        ("run", "--json", ""): files,
        ("run", "--set", "run.method", "=", ""): {"euler", "midpoint", "rk4", "cash_karp5"},
        ("run", "--set", "run.method", "=", "r"): {"rk4"},
        ("run", "--set", "=", "run.start", "=", "m"): {"magnetised"},
        ("run", "--set", "controller.dead_time_compensation", "="): {"true", "false"},
        ("run", "--set", "run.duration_s", "=", ""): set(),
        ("run", "--set", "run.du"): {"run.duration_s="},
        ("run", "--set", "run.duration_s", "=", "2", "--tr"): {"--trace"},
        ("run", "--set", "run.duration_s", "=", "2", "a"): {"a.toml"},
        ("check", "--schema", ""): {"scenario", "machine", "system"},
        ("check", "--schema", "--q"): {"--quiet"},
        ("--completion", "z"): {"zsh"},
        ("nonsense", ""): set(),
    }.items():
        seen = bash(folder, *words)
        check(f"bash: {words}", seen == wanted, seen)
    seen = bash(folder, "compare", "a.toml", "--set", "")
    check("bash: --set offers every key", seen == {key + "=" for key in key_names}, seen ^ {key + "=" for key in key_names})


class Terminal:
    """A shell at a terminal so large that nothing wraps and no list is asked about."""

    def __init__(self, folder, *command):
        self.pid, self.fd = pty.fork()
        if self.pid == 0:
            fcntl.ioctl(0, termios.TIOCSWINSZ, struct.pack("HHHH", 900, 400, 0, 0))
            os.chdir(folder)
            os.environ.update(TERM="dumb", PATH=f"{slipbench.parent}:{os.environ['PATH']}",
                              HOME=str(folder), INPUTRC="/dev/null", HISTFILE="")
            os.execvp(command[0], command)

    def read(self, wanted, patience=20.0):
        """What comes until all that is wanted has been seen and nothing more came for 0.05 s, or patience ends."""
        text, end = "", time.monotonic() + patience
        while time.monotonic() < end:
            if select.select([self.fd], [], [], 0.05)[0]:
                try:
                    text += os.read(self.fd, 65536).decode(errors="replace")
                except OSError:
                    break
            elif all(part in text for part in wanted):
                break
        return re.sub(r"\x1b\[[0-9;?]*[A-Za-z]|\r|\x07", "", text)

    def do(self, line):
        """A line that the shell carries out; the mark is written in two parts so that its echo is not taken for it."""
        os.write(self.fd, (line + ("; " if line else "") + "echo do'ne'\n").encode())
        return self.read(["done\r\n"])

    def typed(self, text, wanted):
        os.write(self.fd, text.encode())
        seen = self.read(wanted)
        os.write(self.fd, b"\x15")  # clears the line
        self.do("")
        return seen

    def close(self):
        os.write(self.fd, b"exit\n")
        os.close(self.fd)
        os.waitpid(self.pid, 0)


def at_terminal(folder, name, *command, setup):
    shell = Terminal(folder, *command)
    for line in setup:
        shell.do(line)
    for text, wanted in {
        "slipbench ru\t": "slipbench run ",
        "slipbench run a.toml --tr\t": "--trace",
        "slipbench run a.toml --trace t\t": "t.csv",
        "slipbench check a\t": "a.toml",
        "slipbench run a.toml --set run.du\t": "run.duration_s=",
        "slipbench run a.toml --set run.method=r\t": "run.method=rk4",
        "slipbench run a.toml --set estimator.0.nam\t": "estimator.0.name=",
        "slipbench --completion z\t": "--completion zsh",
    }.items():
        seen = shell.typed(text, [wanted])
        check(f"{name} at a terminal: {text!r} gives {wanted!r}", wanted in seen, seen)
    return shell


def zsh_lists(shell):
    """The lists that zsh shows when nothing is left to complete."""
    for verb in verbs:
        seen = shell.typed(f"slipbench {verb} a.toml --\t", options[verb])
        shown = set(re.findall(r"(?<![\w-])--[a-z-]+", seen.split("--", 1)[1]))
        check(f"zsh: options of {verb} and no others", shown == options[verb], shown ^ options[verb])
    seen = shell.typed("slipbench \t\t", verbs)
    check("zsh: verbs first", all(re.search(rf"\b{verb}\b", seen) for verb in verbs), seen)
    seen = shell.typed("slipbench run a.toml --set \t\t", key_names)
    missing = {key for key in key_names if not re.search(rf"(?<![\w.]){re.escape(key)}(?![\w.])", seen)}
    check("zsh: --set offers every key", not missing, sorted(missing)[:5])


with tempfile.TemporaryDirectory() as name, tempfile.TemporaryDirectory() as functions:
    folder, functions = pathlib.Path(name), pathlib.Path(functions)
    for file in ("a.toml", "b c.toml", "t.csv", "f.svg", "x.txt"):
        (folder / file).touch()
    (folder / "sub").mkdir()
    (folder / "slipbench.bash").write_text(output("--completion", "bash"))
    (functions / "_slipbench").write_text(output("--completion", "zsh"))
    bash_function(folder)
    bash_shell = at_terminal(folder, "bash", "bash", "--norc", "-i", setup=["PS1='> '", "source slipbench.bash"])
    bash_shell.close()
    syntax = subprocess.run(["zsh", "-n", functions / "_slipbench"], capture_output=True, text=True)
    check("zsh -n finds no fault", syntax.returncode == 0 and not syntax.stderr, syntax.stderr)
    zsh_shell = at_terminal(folder, "zsh", "zsh", "-f", "-i", setup=[
        "PS1='> '; LISTMAX=0; setopt no_list_beep no_beep",
        f"fpath=({functions} $fpath); autoload -Uz compinit; compinit -u -d {functions}/dump"])
    zsh_lists(zsh_shell)
    zsh_shell.close()

print(f"{len(failures)} failed")
sys.exit(1 if failures else 0)
