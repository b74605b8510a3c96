"""The behaviour alarm: every shipped scenario is run and its figures held against committed ones.

    behaviour.py SLIPBENCH SOURCE figures              every figure within its band (exit 1 if not)
    behaviour.py SLIPBENCH SOURCE digests TOOLCHAIN    every digest the same; skipped (exit 77) under another toolchain
    behaviour.py SLIPBENCH SOURCE alarm                shows that it can ring: a belief 5 % off must be found
    behaviour.py SLIPBENCH SOURCE keep TOOLCHAIN       writes both anew: explain every change in the commit message

A figure's band is what it takes over this and 12 other draws of the same noise, each side widened by half of that range and by a
tenth of a percent of the figure: another draw passes, another behaviour does not. A digest changes with the last bit.
"""
import concurrent.futures
import json
import math
import os
import pathlib
import subprocess
import sys

DRAWS = 12
WIDER, FLOOR = 0.5, 1e-3
NOT_FIGURES = ("kind", "step_ns")


def run(slipbench, scenario, draw=0, *options):
    command = [slipbench, "run", str(scenario), "--json", "--run", str(draw), *options]
    answer = subprocess.run(command, capture_output=True, text=True)
    if answer.returncode not in (0, 1):
        raise SystemExit(f"{scenario.name}: exit status {answer.returncode}: {answer.stderr.strip()}")
    return json.loads(answer.stdout)


def figures_of(result):
    figures = {"status": result["status"]}
    for name, value in result["drive"].items():
        figures[f"drive.{name}"] = value
    for estimator, values in result["estimators"].items():
        figures.update({f"{estimator}.{name}": v for name, v in values.items() if name not in NOT_FIGURES})
    return figures


def band_of(values):
    """What may be met: a list of words and null, or [low, high] and null where some draws have no value."""
    numbers = [v for v in values if isinstance(v, (int, float))]
    others = sorted({v for v in values if not isinstance(v, (int, float))}, key=str)
    if not numbers:
        return {"is": others}
    low, high = min(numbers), max(numbers)
    more = WIDER * (high - low) + FLOOR * max(abs(low), abs(high))
    digits = max(0, 2 - math.floor(math.log10(more))) if more > 0 else 6
    band = {"from": round(low - more, digits), "to": round(high + more, digits)}
    return {**band, "or": others} if others else band


def outside(value, band):
    if "is" in band:
        return value not in band["is"]
    if isinstance(value, (int, float)):
        return not band["from"] <= value <= band["to"]
    return value not in band.get("or", [])


def alarm(slipbench, scenarios, kept):
    scenario = next(s for s in scenarios if s.stem in kept["scenarios"])
    row = kept["scenarios"][scenario.stem]
    result = run(slipbench, scenario, 0, "--set", "belief.stator_resistance=1.05")
    found = [key for key, value in figures_of(result).items() if outside(value, row["figures"][key])]
    digests = [key for key, value in result["digest"].items() if value != row["digest"][key]]
    print(f"{scenario.stem} with a belief 5 % off: {len(found)} figures outside their bands, {len(digests)} digests changed")
    return 0 if found and digests else 1


def main(slipbench, source, what, toolchain=""):
    folder = pathlib.Path(source)
    scenarios = sorted((folder / "configs/scenarios").glob("*.toml"))
    kept_file = folder / "tests/behaviour/kept.json"
    kept = json.loads(kept_file.read_text()) if kept_file.exists() else {}
    if what == "digests" and kept["toolchain"] != toolchain:
        print(f"skipped: the digests belong to {kept['toolchain']}, this is {toolchain}")
        return 77
    if what == "alarm":
        return alarm(slipbench, scenarios, kept)
    with concurrent.futures.ThreadPoolExecutor(os.cpu_count()) as pool:
        draws = 1 + DRAWS if what == "keep" else 1
        jobs = {s.stem: [pool.submit(run, slipbench, s, draw) for draw in range(draws)] for s in scenarios}
        results = {name: [job.result() for job in row] for name, row in jobs.items()}
    if what == "keep":
        kept = {"toolchain": toolchain, "scenarios": {}}
        for name, row in results.items():
            drawn = [figures_of(result) for result in row]
            kept["scenarios"][name] = {"digest": row[0]["digest"],
                                       "figures": {key: band_of([figures[key] for figures in drawn]) for key in drawn[0]}}
        text = json.dumps(kept, indent=1)
        kept_file.write_text(flattened(text) + "\n")
        print(f"{kept_file}: {len(results)} scenarios kept")
        return 0
    changed = checked = 0
    for name, (result,) in results.items():
        if name not in kept["scenarios"]:
            changed += 1
            print(f"{name}: nothing is kept of it yet: run this with `keep`")
            continue
        row = kept["scenarios"][name]
        ours, theirs = (figures_of(result), row["figures"]) if what == "figures" else (result["digest"], row["digest"])
        for key in sorted(ours.keys() | theirs.keys()):
            checked += 1
            wrong = key not in ours or key not in theirs
            wrong = wrong or (outside(ours[key], theirs[key]) if what == "figures" else ours[key] != theirs[key])
            if wrong:
                changed += 1
                print(f"{name}: {key} is {ours.get(key, 'gone')}, kept is {theirs.get(key, 'nothing')}")
    for name in kept["scenarios"].keys() - results.keys():
        changed += 1
        print(f"{name}: kept, but no such scenario is shipped")
    print(f"{len(results)} scenarios, {checked} {what}: {changed} changed")
    return 1 if changed or not checked else 0


def flattened(text):
    """Bands on one line each, so that a change is one line of a diff."""
    lines, inner = [], None
    for line in text.splitlines():
        if inner is None and line.startswith("    ") and line.endswith("{"):
            inner = [line]
        elif inner is not None:
            inner.append(line.strip())
            if line.startswith("    }"):
                lines.append("".join(inner))
                inner = None
        else:
            lines.append(line)
    return "\n".join(lines)


if __name__ == "__main__":
    if len(sys.argv) < 4 or sys.argv[3] not in ("figures", "digests", "alarm", "keep"):
        sys.exit(__doc__)
    sys.exit(main(*sys.argv[1:]))
