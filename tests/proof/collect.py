"""Runs the proofs and benchmarks one after another and writes down what each printed.

usage: collect.py [--quick] [--only PART]     in the source folder, after everything is built

Full and quick runs over everything write docs/proof.md and docs/proof.json; a run of a part only prints. What does not hold stands
there as such, and the exit code is 1.
"""
import argparse
import datetime
import json
import os
import pathlib
import platform
import subprocess
import sys
import time

BUILD = pathlib.Path("build")


def listed():
    """Kind, name, source and quick arguments of each program, as its CMakeLists.txt declares them."""
    for line in (BUILD / "claims.txt").read_text().splitlines():
        kind, name, source, *quick = line.split()
        yield kind, name, source, quick


def claim_of(source):
    """The comment at the head of the program's source: what it claims, and how it finds out."""
    lines = []
    for line in pathlib.Path(source).read_text().splitlines():
        if not line.startswith("//"):
            break
        lines.append(line[2:].strip())
    return "\n".join(lines).strip()


def run(kind, name, source, arguments):
    program = BUILD / "bin" / (f"proof_{name}" if kind == "proof" else name)
    began = time.monotonic()
    done = subprocess.run([str(program), *arguments], capture_output=True, text=True, errors="replace",
                          env={**os.environ, "COILASSAY_PROGRAM": str(BUILD / "bin" / "coilassay")})
    return {"kind": kind, "name": name, "arguments": arguments, "claim": claim_of(source), "holds": done.returncode == 0,
            "exit_code": done.returncode, "seconds": round(time.monotonic() - began, 1),
            "output": (done.stdout + done.stderr).splitlines()}


def machine():
    model = "unknown processor"
    for line in pathlib.Path("/proc/cpuinfo").read_text().splitlines():
        if line.startswith("model name"):
            model = line.split(":", 1)[1].strip()
            break
    compiler = subprocess.run(["c++", "--version"], capture_output=True, text=True).stdout.splitlines()[:1]
    program = subprocess.run([str(BUILD / "bin" / "coilassay"), "--version"], capture_output=True, text=True).stdout.strip()
    return {"processor": model, "cores": os.cpu_count(), "load_before": round(os.getloadavg()[0], 2), "system": platform.platform(),
            "python": platform.python_version(), "compiler": compiler[0] if compiler else "unknown", "program": program}


def shortened(lines, head=12, tail=30):
    """Long tables of cells are left to docs/proof.json; what they come to stands at their end."""
    if len(lines) <= head + tail + 5:
        return lines
    return [*lines[:head], f"... {len(lines) - head - tail} more lines in proof.json ...", *lines[-tail:]]


def page(document):
    m = document["machine"]
    text = ["# Proof", "",
            "What is claimed, by the command that shows it. Made by `sh tests/proof.sh`" + (" --quick" if document["quick"] else "") +
            "; what does not hold stands here as such.", "",
            f"{m['program']}, {document['date']}; {m['processor']}, {m['cores']} cores, load {m['load_before']} before the run; "
            f"{m['compiler']}; {m['system']}.", ""]
    if document["quick"]:
        text += ["**A quick run**: few trials each, so that the figures scatter and the limits give way for it. The full sizes are the programs' defaults.", ""]
    text += ["| program | | seconds |", "|---|---|---|"]
    for r in document["results"]:
        text.append(f"| [{r['name']}](#{r['name']}) | {'holds' if r['holds'] else '**does not hold**'} | {r['seconds']} |")
    text.append("")
    for kind, title in (("proof", "Claims"), ("benchmark", "Speed")):
        text += [f"## {title}", ""]
        for r in (r for r in document["results"] if r["kind"] == kind):
            command = " ".join([f"build/bin/{'proof_' if kind == 'proof' else ''}{r['name']}", *r["arguments"]])
            text += [f"### {r['name']}", "", "```", *r["claim"].splitlines(), "```", "",
                     f"`{command}`: {'holds' if r['holds'] else '**does not hold**, exit code ' + str(r['exit_code'])}", "",
                     "```", *shortened(r["output"]), "```", ""]
    return "\n".join(text).rstrip() + "\n"


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--quick", action="store_true", help="few trials each, some minutes in all")
    parser.add_argument("--only", default="", help="only programs whose name holds this")
    asked = parser.parse_args()
    chosen = [entry for entry in listed() if asked.only in entry[1]]
    if not chosen:
        sys.exit(f"no proof or benchmark has '{asked.only}' in its name")
    document = {"schema": "coilassay.proof/1", "date": datetime.datetime.now(datetime.timezone.utc).strftime("%Y-%m-%d"),
                "quick": asked.quick, "machine": machine(), "results": []}
    for kind, name, source, quick in chosen:
        print(f"== {name}", flush=True)
        result = run(kind, name, source, quick if asked.quick else [])
        print(*result["output"], sep="\n", flush=True)
        document["results"].append(result)
    if not asked.only:
        pathlib.Path("docs/proof.json").write_text(json.dumps(document, indent=1, ensure_ascii=False) + "\n")
        pathlib.Path("docs/proof.md").write_text(page(document))
        print("written: docs/proof.md, docs/proof.json")
    missed = [r["name"] for r in document["results"] if not r["holds"]]
    if missed:
        sys.exit("does not hold: " + " ".join(missed))


main()
