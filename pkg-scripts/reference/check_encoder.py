"""Checks the bundled photo encoder on real pictures. Prints a table; exits with 1 if a check fails.

1. The port: the float32 network with its classifier names what scikit-image's cat and coffee show (ImageNet classes
   281, 282, 285 are cats, 967 is espresso).
2. The whole path, natively: the program's embedding of a file against the float32 network under onnxruntime on the same
   file read by Pillow (orientation, white background, centre square, its antialiased bicubic).
3. The browser: the WebAssembly module's embedding of the same file under Node against the native one.

Pictures: scikit-image and scikit-learn carry some in their wheels; Debian's tuxpaint-stamps-default has photos (fetched
with apt-get download into data/stamps when apt is there). Reference versions: requirements.txt.
"""

import argparse
import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import onnxruntime
import skimage
import sklearn
from PIL import Image, ImageOps

HERE = Path(__file__).resolve().parent
ROOT = HERE.parent.parent
WORK = ROOT / "data" / "check-encoder"
ENCODER = ROOT / "www" / "encoders" / "photo.onnx"
SIDE = 224
LEAST_TO_FLOAT = 0.995
# A picture smaller than the network's input is enlarged, and the answer hangs on how the resampler rounds between its
# two passes: the float network on Pillow's own 8-bit and float resampling agrees to 0.993 there.
LEAST_TO_FLOAT_ENLARGED = 0.99
LEAST_TO_WASM = 0.9999
FEWEST = 30
STAMPS = 40


def stamps():
    """Photos among Debian's stamps, spread over the folders; none, with one line saying so, where apt can't get them."""
    folder = ROOT / "data" / "stamps"
    package = "tuxpaint-stamps-default"
    if not folder.exists():
        try:
            WORK.mkdir(parents=True, exist_ok=True)
            subprocess.run(["apt-get", "download", package], cwd=WORK, check=True, capture_output=True)
            (fetched,) = WORK.glob(f"{package}_*.deb")
            subprocess.run(["dpkg", "-x", fetched, folder], check=True)
            fetched.unlink()
        except (OSError, ValueError, subprocess.CalledProcessError):
            print(f"skipped: Debian's {package} can't be had here")
            return []
    found = sorted(path for path in folder.rglob("*.png") if path.stat().st_size > 60_000)
    return found[:: max(1, len(found) // STAMPS)][:STAMPS]


def pictures():
    bundled = Path(skimage.__file__).parent / "data"
    # The drawn test patterns among them are no pictures.
    patterns = {"chessboard_GRAY.png", "chessboard_RGB.png", "phantom.png", "multipage.tif", "multipage_rgb.tif"}
    found = sorted(path for path in bundled.iterdir() if path.suffix in {".png", ".jpg", ".gif"} and path.name not in patterns)
    found += sorted((Path(sklearn.__file__).parent / "datasets" / "images").glob("*.jpg"))
    return found + stamps()


def read(path):
    """The network's input, 1 × 3 × 224 × 224, by Pillow alone."""
    picture = ImageOps.exif_transpose(Image.open(path))
    if picture.mode.startswith("I"):
        picture = Image.fromarray(np.rint(np.asarray(picture, np.float64) / 257).astype(np.uint8))
    if picture.has_transparency_data:
        picture = picture.convert("RGBA")
        picture = Image.alpha_composite(Image.new("RGBA", picture.size, "white"), picture)
    picture = picture.convert("RGB")
    edge = min(picture.size)
    left, top = (picture.width - edge) / 2, (picture.height - edge) / 2
    picture = picture.resize((SIDE, SIDE), Image.Resampling.BICUBIC, box=(left, top, left + edge, top + edge))
    return ((np.asarray(picture, np.float32) - 127) / 128).transpose(2, 0, 1)[None]


def session(name, *options):
    file = WORK / name
    if not file.exists():
        subprocess.run([sys.executable, HERE / "make_encoder.py", "photo", "--float", file, *options], check=True)
    settings = onnxruntime.SessionOptions()
    settings.intra_op_num_threads = 1
    return onnxruntime.InferenceSession(file, settings, providers=["CPUExecutionProvider"])


def cosines(a, b):
    a, b = a.astype(np.float64), b.astype(np.float64)
    return (a * b).sum(axis=1) / np.linalg.norm(a, axis=1) / np.linalg.norm(b, axis=1)


def native(found):
    out = WORK / "native.npy"
    command = ["cargo", "run", "--quiet", "--release", "--example", "embed_photos", "--", ENCODER, out, *found]
    subprocess.run(command, cwd=ROOT, check=True)
    return np.load(out)


def wasm(found, rows):
    """The module as the page has it; built unless `--wasm` names a folder with its bindings."""
    out = WORK / "wasm.f32"
    folder = options.wasm
    if folder is None:
        folder = WORK / "wasm"
        target = Path(os.environ.get("CARGO_TARGET_DIR", ROOT / "target"))
        module = target / "wasm32-unknown-unknown" / "wasm" / "kenspeckle.wasm"
        build = ["cargo", "build", "--quiet", "--profile", "wasm", "--lib", "--target", "wasm32-unknown-unknown"]
        subprocess.run(build, cwd=ROOT, check=True)
        bind = ["cargo", "run", "--quiet", "--release", "-p", "kenspeckle-tools", "--bin", "bind", "--", module, folder]
        subprocess.run(bind, cwd=ROOT, check=True)
    names = "\n".join(map(str, found))
    subprocess.run(["node", HERE / "embed_photos.mjs", folder, ENCODER, out], input=names, text=True, check=True)
    return np.fromfile(out, "<f4").reshape(rows, -1)


def main():
    WORK.mkdir(parents=True, exist_ok=True)
    passed = failed = 0

    def check(right, line):
        nonlocal passed, failed
        passed, failed = passed + right, failed + (not right)
        print(f"{line}  {'ok' if right else 'FAILED'}")

    print(f"onnxruntime {onnxruntime.__version__}, Pillow {Image.__version__}, scikit-image {skimage.__version__}")
    classifier = session("float-classifier.onnx", "--with-classifier")
    bundled = Path(skimage.__file__).parent / "data"
    for name, classes in (("chelsea.png", {281, 282, 285}), ("coffee.png", {967})):
        logits = classifier.run(None, {"photo": read(bundled / name)})[0][0]
        top = np.argsort(-logits)[: len(classes)].tolist()
        check(set(top) == classes, f"port: {name} is {top}")

    found = pictures()
    check(len(found) >= FEWEST, f"{len(found)} pictures, at least {FEWEST}")
    network = session("float.onnx")
    reference = np.concatenate([network.run(None, {"photo": read(path)})[0] for path in found])
    ours = native(found)
    to_float = cosines(ours, reference)
    to_wasm = np.full(len(found), np.nan)
    if shutil.which("node"):
        to_wasm = cosines(ours, wasm(found, len(found)))
    else:
        print("skipped: Node is not here, so native and WebAssembly are not compared")

    print(f"{'picture':44}  to float  to wasm")
    for path, float_cosine, wasm_cosine in zip(found, to_float, to_wasm):
        enlarged = min(Image.open(path).size) < SIDE
        least = LEAST_TO_FLOAT_ENLARGED if enlarged else LEAST_TO_FLOAT
        right = float_cosine >= least and not wasm_cosine < LEAST_TO_WASM
        line = f"{path.parent.name + '/' + path.name:44}  {float_cosine:.5f}   {wasm_cosine:.6f}"
        check(right, line + ("  (enlarged)" if enlarged else ""))
    print(f"to float: mean {to_float.mean():.5f}, least {to_float.min():.5f}; to wasm: least {to_wasm.min():.6f}")
    if options.json:
        options.json.write_text(json.dumps({"to_float": to_float.tolist(), "to_wasm": to_wasm.tolist()}))
    print(f"{passed} passed, {failed} failed")
    sys.exit(failed > 0)


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__.partition("\n")[0])
    parser.add_argument("--wasm", type=Path, metavar="FOLDER", help="bindings that are built already, such as www/kit/wasm")
    parser.add_argument("--json", type=Path, metavar="FILE", help="write the cosines there too")
    options = parser.parse_args()
    main()
