"""Gives every item of a set its vector: pictures with the program, so that numbers are those of the encoder that ships; texts with
the published encoder (embed_text.py).

    python embed.py SET…
"""

import argparse
import csv
import hashlib
import json
import subprocess
import sys
from pathlib import Path

import numpy as np

import embed_text
import fetch
import sets

PROGRAM = sets.ROOT / "target" / "release" / "kenspeckle"


def build(say):
    say("building the program")
    cargo(["build", "--release", "--features", "cli"])


def cargo(arguments):
    """Runs cargo quietly and returns what the command printed."""
    done = subprocess.run(["cargo", arguments[0], "--quiet", *arguments[1:]], cwd=sets.ROOT, capture_output=True, text=True, check=False)
    if done.returncode:
        raise sets.Unmeasured(f"`cargo {' '.join(arguments)}` failed:\n{done.stderr.strip()}")
    return done.stdout


def bench_program(name):
    """Builds one of benches/ and returns its executable."""
    built = cargo(["bench", "--features", "cli", "--bench", name, "--no-run", "--message-format=json"])
    made = [message.get("executable") for message in map(json.loads, built.splitlines()) if message.get("target", {}).get("name") == name]
    return Path(made[-1])


def encoder_identity():
    """Changes whenever the same picture might get another embedding."""
    digest = hashlib.sha256()
    sources = [sets.ROOT / "src" / "encoder" / f"{part}.rs" for part in ("picture", "photo", "network")]
    for path in [sets.ROOT / "www" / "encoders" / "photo.onnx", *sources]:
        digest.update(path.read_bytes())
    return digest.hexdigest()


def vectors_of(name, say):
    """Makes sure that the vectors of a set are there and of today's encoder."""
    kind = sets.ALL[name].kind
    {"pictures": vectors_of_pictures, "texts": vectors_of_texts, "table": vectors_of_table}[kind](name, say)


def vectors_of_table(name, say):
    """A table is vectors already."""
    if not (sets.VECTORS / f"{name}.npy").exists() and fetch.fetch([name]):
        raise sets.Unmeasured(f"the set {name} can't be had")


def vectors_of_texts(name, say):
    if fetch.fetch([name]):
        raise sets.Unmeasured(f"the set {name} can't be had")
    file, stamp = sets.VECTORS / f"{name}.npy", sets.VECTORS / f"{name}.encoder"
    identity = hashlib.sha256((sets.SETS / f"{name}.csv").read_bytes() + embed_text.identity().encode()).hexdigest()
    if file.exists() and stamp.exists() and stamp.read_text() == identity:
        return
    items = sets.read_texts(name)
    say(f"{name}: {len(items)} texts get their vectors")
    sets.VECTORS.mkdir(parents=True, exist_ok=True)
    np.save(file, embed_text.embed([text for _, _, text in items], say))
    sets.write_items(file.with_suffix(".csv"), [(category, item) for category, item, _ in items])
    stamp.write_text(identity)


def vectors_of_pictures(name, say):
    file = sets.VECTORS / f"{name}.npy"
    stamp = sets.VECTORS / f"{name}.encoder"
    identity = encoder_identity()
    if file.exists() and stamp.exists() and stamp.read_text() == identity:
        return
    if fetch.fetch([name]):
        raise sets.Unmeasured(f"the set {name} can't be had")
    build(say)
    say(f"{name}: embedding its pictures")
    sets.VECTORS.mkdir(parents=True, exist_ok=True)
    done = subprocess.run([PROGRAM, "embed", sets.SETS / name, "--out", file], capture_output=True, text=True, check=False)
    if done.returncode:
        raise sets.Unmeasured(f"`kenspeckle embed` failed (exit code {done.returncode}): {done.stderr.strip()}")
    names = file.with_suffix(".names.csv")
    with open(names, newline="", encoding="utf-8") as rows:
        items = [row["item"] for row in csv.DictReader(rows)]
    sets.write_items(file.with_suffix(".csv"), [item.split("/", 1) for item in items])
    names.unlink()
    stamp.write_text(identity)


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("sets", nargs="+", choices=list(sets.ALL), metavar="SET")
    for name in parser.parse_args().sets:
        vectors_of(name, lambda text: print(text, file=sys.stderr, flush=True))


if __name__ == "__main__":
    main()
