"""Measures the built page: times in Chromium beside onnxruntime-web, and the bytes of a first visit."""

import json
import subprocess
import sys
from collections import Counter

import numpy as np
from PIL import Image
from skimage import data as sample_pictures

import clients
import embed
import fetch
import sets

PACKAGES = {"playwright-core": "1.65.1", "onnxruntime-web": "1.30.0"}
PILE, TRAYS, ANSWERS_PER_TRAY = 400, 10, 10
PAST_CATEGORIES, PAST_ITEMS = 580, 8
ROUNDS, WARM_UP = 60, 8
FOLDER = sets.DATA / "bench" / "page"
NOTE_TOKENS = 32
MANY_NOTES, MANY_TRAYS, MANY_ANSWERS = 1000, 8, 24
MOST_MILLISECONDS_A_FRAME = 100
# A phone's camera gives about 12 million pixels.
PHONE = (4032, 3024)
MOST_MILLISECONDS_TO_SORT = 50
MOST_SECONDS_TO_LEARN = 60


def pile():
    """A pile of 400 stamps of which 10 categories have trays: vectors and, for each item, its tray or −1."""
    categories = sets.read_categories("stamps")
    trays = [category for category, _ in sorted(Counter(categories).items(), key=lambda pair: (-pair[1], pair[0]))[:TRAYS]]
    rows = [row for row, category in enumerate(categories) if category in trays]
    rows += [row for row, category in enumerate(categories) if category not in trays]
    rows = rows[:PILE]
    labels = [trays.index(categories[row]) if categories[row] in trays else -1 for row in rows]
    return sets.read_vectors("stamps")[rows], labels


def notes():
    """Real notes of exactly so many tokens, start and end included, with their rows in the encoder's token table."""
    sys.path.insert(0, str(sets.ROOT / "pkg-scripts" / "reference"))
    import make_encoder
    import minilm
    from tokenizers import Tokenizer

    if fetch.fetch(["quotations"]):
        raise sets.Unmeasured("the set quotations can't be had")
    tokenizer_file = make_encoder.text_parts()["tokenizer.json"]
    tokenizer = Tokenizer.from_str(tokenizer_file.decode())
    tokenizer.no_padding()
    tokenizer.no_truncation()
    kept = {row: place for place, row in enumerate(row for row, token in enumerate(minilm.read_vocabulary(tokenizer_file)) if not token.startswith(minilm.UNUSED))}
    texts = [text for _, _, text in sets.read_texts("quotations")]
    found = [{"text": text, "tokens": [kept[row] for row in rows]} for text in texts if len(rows := tokenizer.encode(text).ids) == NOTE_TOKENS]
    return found[:20]


def many_notes():
    """Notes enough to keep a page busy, of as many categories as there are keys for, each with its tray."""
    texts = sets.read_texts("quotations")
    counts = Counter(category for category, _, _ in texts)
    trays = [category for category, _ in sorted(counts.items(), key=lambda pair: (-pair[1], pair[0]))[:MANY_TRAYS]]
    found = [{"text": text, "tray": category} for category, _, text in texts if category in trays]
    found += [{"text": text, "tray": category} for category, _, text in texts if category not in trays]
    return {"notes": found[:MANY_NOTES], "answers": MANY_ANSWERS}


def past():
    """A past pile of 580 drawn icons with up to 8 pictures of each: vectors and, for each item, its category."""
    of = {}
    for row, category in enumerate(sets.read_categories("icons-learn")):
        of.setdefault(category, []).append(row)
    chosen = [rows[:PAST_ITEMS] for rows in of.values() if len(rows) >= 2][:PAST_CATEGORIES]
    labels = [category for category, rows in enumerate(chosen) for _ in rows]
    return sets.read_vectors("icons-learn")[[row for rows in chosen for row in rows]], labels


def prepare(say):
    """Writes what the page's measurements read into FOLDER."""
    embed.vectors_of("stamps", say)
    embed.vectors_of("icons-learn", say)
    clients.install_node_packages(PACKAGES)
    FOLDER.mkdir(parents=True, exist_ok=True)
    network = FOLDER / "photo-f32.onnx"
    if not network.exists():
        subprocess.run([sets.ROOT / "pkg-scripts" / "make-encoder", "photo", "--float", network], check=True)
    network = FOLDER / "text-f32.onnx"
    if not network.exists():
        subprocess.run([sets.ROOT / "pkg-scripts" / "make-encoder", "text", "--float", network], check=True)
    vectors, labels = pile()
    vectors.astype("<f4").tofile(FOLDER / "pile.f32")
    past_vectors, past_labels = past()
    past_vectors.astype("<f4").tofile(FOLDER / "past.f32")
    # Photos that scikit-image carries; each wide enough to fill the encoder's square.
    names = ["chelsea", "coffee", "astronaut", "rocket"]
    for name in names:
        Image.fromarray(getattr(sample_pictures, name)()).save(FOLDER / f"{name}.jpg", quality=90)
    Image.fromarray(sample_pictures.coffee()).resize(PHONE, Image.Resampling.LANCZOS).save(FOLDER / "phone.jpg", quality=90)
    job = {
        "photos": {
            "pictures": [f"/data/{name}.jpg" for name in names],
            "files": {"600 × 400 JPEG": "/data/coffee.jpg", f"{PHONE[0]} × {PHONE[1]} JPEG": "/data/phone.jpg"},
            "rounds": ROUNDS,
            "warmUp": WARM_UP,
        },
        "notes": {"notes": notes(), "rounds": ROUNDS, "warmUp": WARM_UP},
        "manyNotes": many_notes(),
        "answers": {"labels": labels, "trays": TRAYS, "answersPerTray": ANSWERS_PER_TRAY},
        "learning": {"labels": past_labels},
    }
    (FOLDER / "job.json").write_text(json.dumps(job))


def summarise(times):
    return {"median": float(np.median(times)), "95th percentile": float(np.percentile(times, 95)), "most": float(np.max(times))}


def beside(times):
    """Both engines' times, and the ratio of their medians with an interval from resampling the turns."""
    ours, theirs = np.array(times["kenspeckle"]), np.array(times["ort"])
    random = np.random.Generator(np.random.PCG64(0))
    turns = random.integers(len(ours), size=(2000, len(ours)))
    ratios = np.median(ours[turns], axis=1) / np.median(theirs[turns], axis=1)
    low, high = np.percentile(ratios, [2.5, 97.5])
    return {"kenspeckle": summarise(ours), "onnxruntime-web": summarise(theirs), "ratio": float(np.median(ours) / np.median(theirs)), "ratio_interval": [float(low), float(high)]}


def run(say):
    """Measures the page: (numbers, Markdown)."""
    if not (sets.ROOT / "www" / "kit" / "wasm" / "kenspeckle.js").exists():
        raise sets.Unmeasured("the wasm module is not built: run pkg-scripts/build first")
    prepare(say)
    say("measuring in Chromium")
    done = subprocess.run(["node", sets.ROOT / "pkg-scripts" / "bench.d" / "page.mjs", sets.ROOT, sets.NODE, FOLDER], capture_output=True, text=True, check=False)
    if done.returncode:
        raise sets.Unmeasured(f"the page's measurements failed:\n{done.stderr.strip()}")
    raw = json.loads(done.stdout)
    photos, answers, visit = raw["photos"], raw["answers"], raw.get("firstVisit")
    numbers = {
        "browser": f"Chromium {raw['browser']}",
        "libraries": f"onnxruntime-web {PACKAGES['onnxruntime-web']} (wasm, 1 thread, float32 network)",
        "encoder": photos["identity"],
        "load": {"kenspeckle": photos["loadKenspeckle"], "onnxruntime-web": photos["loadOrt"]},
        "cosine_to_float32": {"mean": float(np.mean(photos["cosines"])), "least": float(np.min(photos["cosines"]))},
        "network": beside(photos["network"]),
        "files": {name: beside(times) for name, times in photos["files"].items()},
        "note": beside(raw["notes"]),
        "note_load": {"kenspeckle": raw["notes"]["loadKenspeckle"], "onnxruntime-web": raw["notes"]["loadOrt"]},
        "note_memory": raw["notes"]["memory"],
        "note_cosine_to_float32": {"mean": float(np.mean(raw["notes"]["cosines"])), "least": float(np.min(raw["notes"]["cosines"]))},
        "answer_to_sorted": summarise(answers["sort"]),
        "answer_to_sorted_last_turn": summarise(answers["sort"][-TRAYS:]),
        "next_question": summarise(answers["question"]),
        "right_after_all_answers": answers["right"][-1],
        "learning": raw["learning"],
        "many_notes": raw.get("manyNotes"),
        "first_visit": visit,
    }
    return numbers, table(numbers)


def many_notes_table(many):
    """What the page's main thread did while it held many notes, as Markdown."""
    if not many:
        return ""
    text = f"\n## The page's main thread with {many['notes']:,} notes\n\n"
    text += "Longest task in milliseconds: by the clock, and in time that the thread had a core, which tells more where the machine has other work; and the longest time between two frames.\n\n"
    text += "| | longest task | of it on a core | longest time between frames |\n| --- | --- | --- | --- |\n"
    for name, phase in many["phases"].items():
        text += f"| {name} | {phase['longestTask']:.0f} | {phase['longestTaskCpu']:.0f} | {phase['longestGap']:.0f} |\n"
    times = summarise(many["answerTimes"])
    text += f"\nReading them all took {many['seconds']:.0f} s. From an answer to the sorted pile on the page: median {times['median']:.0f} ms, most {times['most']:.0f} ms. "
    return text + f"At most {MOST_MILLISECONDS_A_FRAME} ms a frame was asked for.\n"


def table(numbers):
    """The numbers as Markdown."""
    text = f"## The page's modules in {numbers['browser']}, one thread\n\nMilliseconds.\n\n"
    text += "| | median | 95th percentile | most |\n| --- | --- | --- | --- |\n"
    times = lambda name, t: f"| {name} | {t['median']:.1f} | {t['95th percentile']:.1f} | {t['most']:.1f} |\n"
    text += times(f"from an answer to the sorted pile ({PILE} items, {TRAYS} trays, 1 to {ANSWERS_PER_TRAY} answers each)", numbers["answer_to_sorted"])
    text += times(f"the same, the last {TRAYS} of these answers", numbers["answer_to_sorted_last_turn"])
    text += times("choosing the next question", numbers["next_question"])
    text += f"\nAt most {MOST_MILLISECONDS_TO_SORT} ms was asked for the first line.\n"
    learning = numbers["learning"]
    text += f"\n## Learning from a past pile of {learning['categories']} categories and {learning['items']} items\n\n"
    text += f"{learning['gather'] / 1000:.1f} s to gather it and {learning['learn'] / 1000:.1f} s to learn; the starter has {learning['bytes']:,} bytes. "
    text += f"At most {MOST_SECONDS_TO_LEARN} s was asked for both. In the page this runs in a worker.\n"
    text += f"\n## Time per photo beside {numbers['libraries']}, turn by turn\n\n"
    text += "| | Kenspeckle | onnxruntime-web | ratio (95 % interval) |\n| --- | --- | --- | --- |\n"
    for name, both in {"network alone, 224 × 224 pixels": numbers["network"], **numbers["files"]}.items():
        low, high = both["ratio_interval"]
        text += f"| {name} | {both['kenspeckle']['median']:.1f} | {both['onnxruntime-web']['median']:.1f} | {both['ratio']:.2f} ({low:.2f}–{high:.2f}) |\n"
    load = numbers["load"]
    text += f"| loading module and network, once | {load['kenspeckle']:.0f} | {load['onnxruntime-web']:.0f} | {load['kenspeckle'] / load['onnxruntime-web']:.2f} |\n"
    text += "\nFor files, Kenspeckle decodes, turns, crops, shrinks and makes the thumbnail itself; for onnxruntime-web the browser's own decoder and a canvas do it, without a thumbnail.\n"
    text += f"Cosine between the two embeddings: mean {numbers['cosine_to_float32']['mean']:.4f}, least {numbers['cosine_to_float32']['least']:.4f}.\n"
    low, high = numbers["note"]["ratio_interval"]
    ours, theirs = numbers["note"]["kenspeckle"]["median"], numbers["note"]["onnxruntime-web"]["median"]
    text += f"\n## Time per note of {NOTE_TOKENS} tokens, turn by turn\n\n| | Kenspeckle | onnxruntime-web | ratio (95 % interval) |\n| --- | --- | --- | --- |\n"
    text += f"| reading a note | {ours:.1f} | {theirs:.1f} | {numbers['note']['ratio']:.2f} ({low:.2f}–{high:.2f}) |\n"
    load = numbers["note_load"]
    text += f"| loading module and network, once | {load['kenspeckle']:.0f} | {load['onnxruntime-web']:.0f} | {load['kenspeckle'] / load['onnxruntime-web']:.2f} |\n"
    text += f"\nKenspeckle makes the tokens too; to onnxruntime-web they are given. Memory of Kenspeckle's module: {numbers['note_memory'] / 1e6:.0f} MB.\n"
    text += f"Cosine between the two embeddings: mean {numbers['note_cosine_to_float32']['mean']:.4f}, least {numbers['note_cosine_to_float32']['least']:.4f}.\n"
    text += many_notes_table(numbers["many_notes"])
    visit = numbers["first_visit"]
    if not visit:
        return text + "\nThe page is not built, so the bytes of a first visit were not counted.\n"
    wire, raw = (sum(file[key] for file in visit["files"]) for key in ("wire", "raw"))
    text += f"\n## Bytes of a first visit\n\n{len(visit['files'])} files, {raw / 1e6:.2f} MB, {wire / 1e6:.2f} MB over the wire (each brotli 11, or as it is where that is smaller). "
    text += ("The service worker then has all it needs offline. " if visit["offline"] else "No service worker took over. ")
    text += f"Requests to another origin: {len(visit['elsewhere'])}.\n\n| file | raw | wire |\n| --- | --- | --- |\n"
    demo = [file for file in visit["files"] if file["file"].startswith("demo/")]
    for file in visit["files"]:
        if file not in demo:
            text += f"| {file['file']} | {file['raw']:,} | {file['wire']:,} |\n"
    if demo:
        text += f"| {len(demo)} files of the demo pile | {sum(file['raw'] for file in demo):,} | {sum(file['wire'] for file in demo):,} |\n"
    return text
