"""Draws episodes: small sorting tasks from labelled data, the same for every learner and every library.

The format is JSON lines that any language reads. The first line says how the episodes were drawn; each line after it is one
episode: `support` and `query` are row numbers of the set's vectors, `support_labels` and `query_labels` the category of each as
0 … way − 1.
"""

import argparse
import hashlib
import json
from collections import defaultdict

import numpy as np

import sets

MOST_QUERIES = 15


def draw(categories, way, shot, episodes, seed):
    """Draws `episodes` tasks of `way` categories with `shot` examples and equally many queries each.

    The queries of a category are as many as the smallest category that takes part allows, at most 15.
    """
    rows = defaultdict(list)
    for row, category in enumerate(categories):
        rows[category].append(row)
    # A category needs one item to ask about beside its examples.
    usable = sorted(category for category, members in rows.items() if len(members) > shot)
    if len(usable) < way:
        raise ValueError(f"{way} categories with more than {shot} items are needed, there are {len(usable)}")
    queries = min(MOST_QUERIES, min(len(rows[category]) for category in usable) - shot)
    random = np.random.Generator(np.random.PCG64(seed))
    drawn = []
    for _ in range(episodes):
        episode = {"support": [], "support_labels": [], "query": [], "query_labels": []}
        for label, choice in enumerate(random.choice(len(usable), way, replace=False)):
            members = random.permutation(rows[usable[choice]])[: shot + queries].tolist()
            episode["support"] += members[:shot]
            episode["query"] += members[shot:]
            episode["support_labels"] += [label] * shot
            episode["query_labels"] += [label] * queries
        drawn.append(episode)
    header = {"way": way, "shot": shot, "queries_per_category": queries, "episodes": episodes, "seed": seed, "categories": len(usable)}
    return header, drawn


def write(name, way, shot, episodes, seed):
    """Draws the episodes of a set into data/bench and returns (path, header, episodes)."""
    header, drawn = draw(sets.read_categories(name), way, shot, episodes, seed)
    header = {"set": name, **header}
    path = sets.DATA / "bench" / f"{name}-{way}way-{shot}shot.episodes.jsonl"
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text("".join(json.dumps(line) + "\n" for line in [header, *drawn]))
    return path, header, drawn


def fingerprint(path):
    return hashlib.sha256(path.read_bytes()).hexdigest()[:16]


def write_as_asked(description):
    """Draws the episodes that the command line asks for: (the set's name, path, header)."""
    parser = argparse.ArgumentParser(description=description.splitlines()[0])
    parser.add_argument("set")
    parser.add_argument("--way", type=int, default=5)
    parser.add_argument("--shot", type=int, default=1)
    parser.add_argument("--episodes", type=int, default=300)
    parser.add_argument("--seed", type=int, default=1)
    arguments = parser.parse_args()
    path, header, _ = write(arguments.set, arguments.way, arguments.shot, arguments.episodes, arguments.seed)
    return arguments.set, path, header


def main():
    _, path, header = write_as_asked(__doc__)
    print(path.relative_to(sets.ROOT), json.dumps(header))


if __name__ == "__main__":
    main()
