"""Gives every picture of a set its embedding with the program, so that numbers are those of the encoder that ships."""

import csv
import hashlib
import subprocess

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


def encoder_identity():
    """Changes whenever the same picture might get another embedding."""
    digest = hashlib.sha256()
    sources = sets.ROOT / "src" / "encoder"
    for path in [sets.ROOT / "www" / "encoders" / "photo.onnx", sources.with_suffix(".rs"), *sorted(sources.rglob("*.rs"))]:
        digest.update(path.read_bytes())
    return digest.hexdigest()


def vectors_of(name, say):
    """Makes sure that the vectors of a set are there and of today's encoder."""
    file = sets.VECTORS / f"{name}.npy"
    if not sets.ALL[name].pictures:
        if not file.exists() and fetch.fetch([name]):
            raise sets.Unmeasured(f"the set {name} can't be had")
        return
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
