// The WebAssembly module under Node: the same bits as the native program, and errors that programs can test.
// Needs the module in www/kit/wasm (pkg-scripts/build) and the program (cargo build --release --features cli).

import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, describe, test } from "node:test";
import { core, npy, program, root } from "../native.mjs";

const { tasks } = JSON.parse(readFileSync(join(root, "tests/data/learners.json"), "utf8"));

let Sorter;
let PhotoEncoder;
let folder;

before(async () => {
  ({ Sorter, PhotoEncoder } = await core());
  folder = mkdtempSync(join(tmpdir(), "kenspeckle-"));
});

after(() => rmSync(folder, { recursive: true, force: true }));

function nativeSort(task, learner) {
  writeFileSync(join(folder, "pile.npy"), npy(task.queries));
  writeFileSync(join(folder, "examples.npy"), npy(task.examples));
  writeFileSync(join(folder, "labels.csv"), task.labels.map((label) => `category ${label}\n`).join(""));
  const options = ["--examples", "examples.npy", "--labels", "labels.csv", "--learner", learner, "--json"];
  const output = execFileSync(program, ["sort", "pile.npy", ...options], { cwd: folder, stdio: ["ignore", "pipe", "ignore"] });
  return JSON.parse(output).items;
}

function wasmSort(task, learner) {
  const sorter = new Sorter({ encoder: "vectors", dimension: task.examples[0].length, nonNegative: false, learner });
  for (const row of task.queries) sorter.addItem(Float32Array.from(row));
  const trays = new Map();
  task.examples.forEach((row, example) => {
    const item = sorter.addItem(Float32Array.from(row));
    const name = `category ${task.labels[example]}`;
    if (!trays.has(name)) trays.set(name, sorter.addTray(name));
    sorter.answer(item, trays.get(name));
  });
  const verdicts = sorter.verdicts();
  const names = new Map(sorter.trays().map(({ tray, name }) => [tray, name]));
  const plausible = task.queries.map((_, item) => sorter.plausible(item));
  sorter.free();
  return { verdicts, names, plausible };
}

describe("native and wasm", () => {
  for (const task of tasks) {
    for (const learner of ["auto", "prototype", "ridge", "gradient"]) {
      test(`${task.name}, ${learner}: the same trays, the same bits`, () => {
        const native = nativeSort(task, learner);
        const { verdicts, names, plausible } = wasmSort(task, learner);
        native.forEach((item, index) => {
          const reason = [null, "unlike", "between", "too-little"][verdicts.setAside[index]];
          assert.equal(reason, item.set_aside);
          if (reason === null) assert.equal(names.get(verdicts.tray[index]), item.tray);
          assert.deepEqual([...plausible[index]].map((tray) => names.get(tray)), item.plausible);
          assert.equal(verdicts.probability[index], Math.fround(item.probability));
        });
      });
    }
  }
});

describe("errors", () => {
  const options = { encoder: "e", dimension: 3, nonNegative: false };
  const throws = (action, code) =>
    assert.throws(action, (error) => {
      assert.ok(error instanceof Error);
      assert.equal(error.name, "KenspeckleError");
      assert.equal(error.code, code);
      assert.ok(error.message.length > 20);
      return true;
    });

  test("options", () => {
    throws(() => new Sorter({}), "options");
    throws(() => new Sorter({ ...options, learner: "magic" }), "options");
    throws(() => new Sorter({ ...options, seed: -1 }), "options");
    throws(() => new Sorter({ ...options, seed: 1.5 }), "options");
    throws(() => new Sorter({ ...options, dimension: 1 }), "dimension-out-of-range");
  });

  test("items and trays", () => {
    const sorter = new Sorter(options);
    throws(() => sorter.addItem(new Float32Array(4)), "wrong-dimension");
    throws(() => sorter.addItem(Float32Array.of(1, NaN, 0)), "not-finite");
    throws(() => sorter.addItem(Float32Array.of(1, Infinity, 0)), "not-finite");
    throws(() => sorter.addItem(new Float32Array(3)), "all-zero");
    const item = sorter.addItem(Float32Array.of(1, 2, 3));
    assert.equal(item, 0);
    throws(() => sorter.answer(item, 0), "no-such-tray");
    const tray = sorter.addTray("One");
    throws(() => sorter.addTray(" one "), "tray-name-taken");
    throws(() => sorter.addTray("  "), "tray-name-empty");
    throws(() => sorter.answer(7, tray), "no-such-item");
    throws(() => sorter.mergeTrays(tray, tray), "merge-into-itself");
    throws(() => Sorter.restore("{}", new Float32Array(0)), "state-unreadable");
    sorter.free();
  });

  test("an encoder file that is none", () => {
    throws(() => new PhotoEncoder(new Uint8Array(100)), "encoder-file");
  });

  test("pictures that are none: the encoder goes on afterwards", () => {
    const encoder = new PhotoEncoder(readFileSync(join(root, "www/encoders/photo.onnx")));
    const picture = (name) => readFileSync(join(root, "tests/data/pictures", name));
    throws(() => encoder.read(new Uint8Array(0), 64), "image-empty");
    throws(() => encoder.read(Buffer.from("words, not a picture, whatever it is called"), 64), "not-an-image");
    throws(() => encoder.read(picture("huge.png"), 64), "image-too-large");
    throws(() => encoder.read(picture("plain.png").subarray(0, 700), 64), "image-unreadable");
    throws(() => encoder.read(picture("progressive.jpg").subarray(0, 900), 64), "image-unreadable");
    const photo = encoder.read(picture("plain.png"), 64);
    assert.equal(photo.embedding().length, encoder.dimension);
    assert.ok(photo.embedding().every((x) => x >= 0 && Number.isFinite(x)));
    photo.free();
    encoder.free();
  });
});

describe("asking", () => {
  const { vectors, answers, chosen } = JSON.parse(readFileSync(join(root, "tests/data/propagation.json"), "utf8"));
  const begin = () => {
    const sorter = new Sorter({ encoder: "vectors", dimension: vectors[0].length, nonNegative: false });
    for (const row of vectors) sorter.addItem(Float32Array.from(row));
    return sorter;
  };

  test("questions are those that numpy chooses", () => {
    const sorter = begin();
    assert.deepEqual([...sorter.nextQuestions(chosen.length)], chosen);
    assert.equal(sorter.nextQuestion(), chosen[0]);
    assert.equal(sorter.outlook(), undefined);
    sorter.free();
  });

  test("the same questions and probabilities as the program", () => {
    const sorter = begin();
    writeFileSync(join(folder, "asked.npy"), npy(vectors));
    const wishes = answers.map(([item, tray]) => ({ do: "answer", tray: `t${tray}`, items: [String(item)] }));
    const input = [...wishes, { do: "strip", tray: "t0", count: 5 }, { do: "stop" }].map((wish) => JSON.stringify(wish) + "\n").join("");
    const output = execFileSync(program, ["ask", "asked.npy", "--json"], { cwd: folder, input, stdio: ["pipe", "pipe", "ignore"] });
    const lines = output.toString().trim().split("\n").map((line) => JSON.parse(line));
    const trays = new Map();
    for (const [item, name] of answers) {
      if (!trays.has(name)) trays.set(name, sorter.answerNew(item, `t${name}`));
      else sorter.answer(item, trays.get(name));
    }
    const question = lines.at(-1);
    assert.equal(String(sorter.nextQuestion()), question.ask);
    const names = new Map(sorter.trays().map(({ tray, name }) => [tray, name]));
    const ranked = sorter.ranking(sorter.nextQuestion()).map(({ tray, probability }) => ({ name: names.get(tray), probability }));
    assert.deepEqual(ranked, question.trays);
    const { now, afterTenMore } = sorter.outlook();
    assert.deepEqual([now.low, now.expected, now.high], question.outlook.now);
    assert.deepEqual([afterTenMore.low, afterTenMore.expected, afterTenMore.high], question.outlook.after_ten_more);
    assert.deepEqual([...sorter.strip(trays.get(0), 5)].map(String), lines.at(-2).strip);
    sorter.free();
  });
});

test("the whole surface: answer, undo, save, restore", () => {
  const sorter = new Sorter({ encoder: "e", dimension: 2, nonNegative: false, seed: 3 });
  const rows = [[1, 0.1], [0.9, -0.1], [0.1, 1], [-0.2, 0.9], [1, -0.2]];
  rows.forEach((row) => sorter.addItem(Float32Array.from(row)));
  assert.deepEqual([...sorter.verdicts().tray], [-1, -1, -1, -1, -1]);
  const first = sorter.nextQuestion();
  assert.ok(first >= 0 && first < 5);
  const flat = sorter.answerNew(0, "flat");
  const tall = sorter.answerNew(2, "tall");
  let verdicts = sorter.verdicts();
  assert.deepEqual([...verdicts.tray], [flat, flat, tall, tall, flat]);
  assert.deepEqual([...verdicts.status], [1, 0, 1, 0, 0]);
  assert.equal(verdicts.runnerUp[1], tall);
  assert.deepEqual(sorter.ranking(1).map(({ tray }) => tray), [flat, tall]);
  sorter.answerNone(3);
  sorter.skip(1);
  sorter.removeItem(4);
  verdicts = sorter.verdicts();
  assert.deepEqual([...verdicts.tray], [flat, flat, tall, -1, -2]);
  assert.deepEqual([...verdicts.status], [1, 3, 1, 2, 4]);
  sorter.answerAll(Uint32Array.of(1, 3), tall);
  assert.deepEqual(sorter.trays(), [
    { tray: flat, name: "flat", answers: 1 },
    { tray: tall, name: "tall", answers: 3 },
  ]);
  const back = Sorter.restore(sorter.state(), Float32Array.from(rows.flat()));
  assert.deepEqual(back.verdicts(), sorter.verdicts());
  for (const action of ["answer", "remove-item", "skip", "none", "answer", "answer"]) {
    assert.ok(back.canUndo);
    assert.equal(back.undo(), action);
  }
  assert.equal(back.undo(), undefined);
  assert.deepEqual(back.trays(), []);
  assert.equal(back.redo(), "answer");
  assert.ok(back.canRedo);
  assert.deepEqual(back.trays(), [{ tray: flat, name: "flat", answers: 1 }]);
  back.free();
  sorter.free();
});
