"""Runs the samples in every README: each scenario in a ```toml block must run, each machine must pass `check`; what is
linked or shown must be there.

usage: document_samples.py SOURCE SLIPBENCH
"""
import pathlib
import re
import subprocess
import sys
import tempfile

source, slipbench = pathlib.Path(sys.argv[1]).resolve(), sys.argv[2]
documents = [p for p in sorted(source.rglob("*.md")) if "build" not in p.relative_to(source).parts]
failed = ran = missing = 0
for document in documents:
    for target in re.findall(r"\]\((?!https?:)([^)#]+)\)", document.read_text()):
        if not (document.parent / target).exists():
            missing += 1
            print(f"{document.relative_to(source)}: no such file: {target}")
    for number, block in enumerate(re.findall(r"```toml\n(.*?)```", document.read_text(), re.S), 1):
        if "[run]" not in block and "[machine]" not in block:
            continue  # a fragment that its text explains
        with tempfile.TemporaryDirectory() as folder:
            sample = pathlib.Path(folder) / "sample.toml"
            sample.write_text(block)
            (pathlib.Path(folder) / "configs").symlink_to(source / "configs")
            verb = "run" if "[run]" in block else "check"
            result = subprocess.run([slipbench, verb, str(sample), "--json"], capture_output=True, text=True)
        ran += 1
        if result.returncode != 0:
            failed += 1
            print(f"{document.relative_to(source)}, sample {number}: {verb} gave {result.returncode}\n{result.stderr}")
print(f"{ran - failed} passed, {failed} failed; {missing} files linked but missing")
sys.exit(1 if failed or missing or ran == 0 else 0)
