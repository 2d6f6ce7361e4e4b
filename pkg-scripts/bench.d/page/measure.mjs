// Runs in the browser: times the built wasm module, beside onnxruntime-web in the same run. One thread for both.
import init, { NoteEncoder, PastPiles, PhotoEncoder, Sorter } from "/kit/wasm/kenspeckle.js";
import * as ort from "/ort/ort.wasm.min.mjs";

const SIDE = 224;
const THUMBNAIL_SIDE = 192;
const bytesOf = async (url) => {
  const response = await fetch(url);
  if (!response.ok) throw new Error(`${url}: ${response.status}`);
  return new Uint8Array(await response.arrayBuffer());
};

function timed(task) {
  const start = performance.now();
  const result = task();
  return [performance.now() - start, result];
}

function cosine(a, b) {
  let [ab, aa, bb] = [0, 0, 0];
  for (let i = 0; i < a.length; i += 1) {
    ab += a[i] * b[i];
    aa += a[i] * a[i];
    bb += b[i] * b[i];
  }
  return ab / Math.sqrt(aa * bb);
}

/** The network's input from RGBA pixels: planes of (value − 127) / 128. */
function tensorOf(rgba) {
  const values = new Float32Array(3 * SIDE * SIDE);
  for (let pixel = 0; pixel < SIDE * SIDE; pixel += 1)
    for (let channel = 0; channel < 3; channel += 1)
      values[channel * SIDE * SIDE + pixel] = (rgba[4 * pixel + channel] - 127) / 128;
  return new ort.Tensor("float32", values, [1, 3, SIDE, SIDE]);
}

async function runNetwork(session, rgba) {
  const output = await session.run({ [session.inputNames[0]]: tensorOf(rgba) });
  return output[session.outputNames[0]].data;
}

/** What a page without Kenspeckle does with a file: the browser decodes, a canvas crops and shrinks. */
async function pixelsByCanvas(file) {
  const bitmap = await createImageBitmap(new Blob([file]));
  const side = Math.min(bitmap.width, bitmap.height);
  const context = new OffscreenCanvas(SIDE, SIDE).getContext("2d", { willReadFrequently: true });
  context.imageSmoothingQuality = "high";
  context.drawImage(bitmap, (bitmap.width - side) / 2, (bitmap.height - side) / 2, side, side, 0, 0, SIDE, SIDE);
  bitmap.close();
  return context.getImageData(0, 0, SIDE, SIDE).data;
}

/** Times both engines on the same pictures, turn by turn. Times in milliseconds. */
export async function photos({ pictures, files, rounds, warmUp }) {
  const start = performance.now();
  await init({ module_or_path: "/kit/wasm/kenspeckle_bg.wasm" });
  const encoder = new PhotoEncoder(await bytesOf("/encoders/photo.onnx"));
  const loadKenspeckle = performance.now() - start;
  ort.env.wasm.numThreads = 1;
  ort.env.wasm.wasmPaths = "/ort/";
  const ortStart = performance.now();
  const session = await ort.InferenceSession.create(await bytesOf("/data/photo-f32.onnx"), { executionProviders: ["wasm"] });
  const loadOrt = performance.now() - ortStart;

  const pixels = await Promise.all(pictures.map(async (url) => new Uint8Array(await pixelsByCanvas(await bytesOf(url)))));
  const result = { loadKenspeckle, loadOrt, identity: encoder.identity, cosines: [], network: { kenspeckle: [], ort: [] }, files: {} };
  for (let round = -warmUp; round < rounds; round += 1) {
    const rgba = pixels[(round + warmUp) % pixels.length];
    const [ours, photo] = timed(() => encoder.readPixels(rgba, SIDE, SIDE, 32));
    const ortBegan = performance.now();
    const theirs = await runNetwork(session, rgba);
    const ortTook = performance.now() - ortBegan;
    if (round >= 0) {
      result.network.kenspeckle.push(ours);
      result.network.ort.push(ortTook);
      result.cosines.push(cosine(photo.embedding(), theirs));
    }
    photo.free();
  }
  for (const [name, url] of Object.entries(files)) {
    const file = await bytesOf(url);
    const times = { kenspeckle: [], ort: [] };
    for (let round = -2; round < rounds / 2; round += 1) {
      const [ours, photo] = timed(() => encoder.read(file, THUMBNAIL_SIDE));
      photo.free();
      const ortBegan = performance.now();
      await runNetwork(session, await pixelsByCanvas(file));
      const ortTook = performance.now() - ortBegan;
      if (round >= 0) {
        times.kenspeckle.push(ours);
        times.ort.push(ortTook);
      }
    }
    result.files[name] = times;
  }
  encoder.free();
  return result;
}

/** Times both engines on the same notes, turn by turn; for onnxruntime-web the tokens are given. Times in milliseconds. */
export async function notes({ notes, rounds, warmUp }) {
  const start = performance.now();
  const { memory } = await init({ module_or_path: "/kit/wasm/kenspeckle_bg.wasm" });
  const encoder = new NoteEncoder(await bytesOf("/encoders/text.onnx"));
  const loadKenspeckle = performance.now() - start;
  ort.env.wasm.numThreads = 1;
  ort.env.wasm.wasmPaths = "/ort/";
  const ortStart = performance.now();
  const session = await ort.InferenceSession.create(await bytesOf("/data/text-f32.onnx"), { executionProviders: ["wasm"] });
  const loadOrt = performance.now() - ortStart;
  const result = { loadKenspeckle, loadOrt, identity: encoder.identity, cosines: [], kenspeckle: [], ort: [] };
  for (let round = -warmUp; round < rounds; round += 1) {
    const { text, tokens } = notes[(round + warmUp) % notes.length];
    const [ours, note] = timed(() => encoder.read(text));
    const ortBegan = performance.now();
    const column = (values) => new ort.Tensor("int32", Int32Array.from(values), [values.length]);
    const { features } = await session.run({ tokens: column(tokens), positions: column(tokens.map((_, place) => place)) });
    const mean = new Float32Array(encoder.dimension);
    features.data.forEach((feature, place) => (mean[place % mean.length] += feature));
    const ortTook = performance.now() - ortBegan;
    if (round >= 0) {
      result.kenspeckle.push(ours);
      result.ort.push(ortTook);
      result.cosines.push(cosine(note.embedding(), mean));
    }
    note.free();
  }
  result.memory = memory.buffer.byteLength;
  encoder.free();
  return result;
}

/** Times answering: each answer to the whole pile sorted again, and then the choice of the next question. Milliseconds. */
export async function answers({ labels, trays, answersPerTray }) {
  await init({ module_or_path: "/kit/wasm/kenspeckle_bg.wasm" });
  const file = await bytesOf("/data/pile.f32");
  const values = new Float32Array(file.buffer);
  const dimension = values.length / labels.length;
  const sorter = new Sorter({ encoder: "benchmark", dimension, nonNegative: true, seed: 1 });
  labels.forEach((_, item) => sorter.addItem(values.subarray(item * dimension, (item + 1) * dimension)));
  const trayOf = Array.from({ length: trays }, (_, tray) => sorter.addTray(`tray ${tray + 1}`));
  const itemsOf = trayOf.map((_, tray) => labels.flatMap((label, item) => (label === tray ? [item] : [])));
  const result = { sort: [], question: [], right: [] };
  for (let turn = 0; turn < answersPerTray; turn += 1) {
    for (const [tray, items] of itemsOf.entries()) {
      const [sort, verdicts] = timed(() => {
        sorter.answer(items[turn], trayOf[tray]);
        return sorter.verdicts();
      });
      const [question] = timed(() => sorter.nextQuestion());
      // The first answers leave nothing to sort into.
      if (turn === 0 && tray === 0) continue;
      result.sort.push(sort);
      result.question.push(question);
      const open = labels.map((_, item) => item).filter((item) => verdicts.status[item] === 0);
      result.right.push(open.filter((item) => verdicts.tray[item] === trayOf[labels[item]]).length / open.length);
    }
  }
  sorter.free();
  return result;
}

/** Times learning a starter from one large past pile: gathering it, then learning. Milliseconds, and the file's bytes. */
export async function learning({ labels }) {
  await init({ module_or_path: "/kit/wasm/kenspeckle_bg.wasm" });
  const values = new Float32Array((await bytesOf("/data/past.f32")).buffer);
  const past = new PastPiles({ encoder: "benchmark", dimension: values.length / labels.length, nonNegative: true });
  const [gather] = timed(() => past.addPile(values, Int32Array.from(labels)));
  const [learn, starter] = timed(() => past.learn());
  const result = { gather, learn, bytes: starter.bytes().length, categories: past.categories, items: past.items };
  starter.free();
  past.free();
  return result;
}
