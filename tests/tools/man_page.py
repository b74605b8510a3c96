"""The man page through the formatters that people's systems use: no warning, every section in the order of man-pages(7), and
every verb, option and status; then the examples, run as they stand.

usage: man_page.py SOURCE SLIPBENCH
"""
import os
import pathlib
import re
import subprocess
import sys
import tempfile

source, slipbench = pathlib.Path(sys.argv[1]).resolve(), pathlib.Path(sys.argv[2]).resolve()
failures = []
FORMATTERS = (["man", "--warnings", "-l", "-Tutf8"], ["groff", "-man", "-ww", "-Tutf8"])
# man-pages(7) gives this order for the sections that it names; ours stand between them.
SECTIONS = ["NAME", "SYNOPSIS", "DESCRIPTION", "VERBS", "OPTIONS", "SCENARIO KEYS", "EXIT STATUS", "EXAMPLES", "CAUTIONS", "FILES"]


def check(what, holds, seen=""):
    if not holds:
        failures.append(what)
        print(f"FAILED: {what}\n  saw: {seen}")


def formatted(command, page):
    environment = dict(os.environ, LC_ALL="C.UTF-8", MANWIDTH="200", GROFF_NO_SGR="1", MANROFFOPT="-c")
    result = subprocess.run([*command, page], capture_output=True, text=True, env=environment)
    return re.sub(".\b", "", result.stdout), result.stderr


def output(*arguments):
    return subprocess.run([slipbench, *arguments], capture_output=True, text=True, check=True).stdout


with tempfile.TemporaryDirectory() as name:
    folder = pathlib.Path(name)
    page, faulty = folder / "slipbench.1", folder / "faulty.1"
    page.write_text(output("--man"))
    faulty.write_text(page.read_text() + ".NOSUCH macro\n")
    check("plain ASCII", page.read_text().isascii())
    helps = output("--help") + "".join(output(verb, "--help") for verb in ("run", "check", "compare"))
    options = set(re.findall(r"^  (?:-h,)?(--[a-z-]+)", helps, re.M))
    for command in FORMATTERS:
        text, warnings = formatted(command, page)
        check(f"{command[0]}: no warning", not warnings, warnings)
        check(f"{command[0]}: a fault would be told", formatted(command, faulty)[1] != "")
        check(f"{command[0]}: sections", re.findall(r"^([A-Z][A-Z ]+)$", text, re.M) == SECTIONS,
              re.findall(r"^([A-Z][A-Z ]+)$", text, re.M))
        for option in options:
            check(f"{command[0]}: {option}", re.search(rf"^ +{option}\b", text, re.M), option)
    for found in re.findall(r"^ +(slipbench .*)$", text.split("\nEXAMPLES\n")[1].split("\nCAUTIONS\n")[0], re.M):
        (folder / "configs").exists() or (folder / "configs").symlink_to(source / "configs")
        result = subprocess.run(["bash", "-o", "pipefail", "-c", found], cwd=folder, capture_output=True, text=True,
                                env=dict(os.environ, PATH=f"{slipbench.parent}:{os.environ['PATH']}"))
        check(f"example: {found}", result.returncode == 0 and result.stdout, result.stderr)
        check("the examples of --help", found in helps, found)

print(f"{len(failures)} failed")
sys.exit(1 if failures else 0)
