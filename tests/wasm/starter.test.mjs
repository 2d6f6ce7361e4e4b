// Starters under Node: the same bytes as `kenspeckle learn`, refusals by code, and what a starter is worth.
// Needs the module in www/kit/wasm (pkg-scripts/build) and the program (cargo build --release --features cli).

import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, describe, test } from "node:test";
import { core, npy, program } from "../native.mjs";

const DIMENSION = 24;
const options = { encoder: "vectors", dimension: DIMENSION, nonNegative: false };

let PastPiles;
let Sorter;
let Starter;
let folder;

before(async () => {
  ({ PastPiles, Sorter, Starter } = await core());
  folder = mkdtempSync(join(tmpdir(), "kenspeckle-"));
});

after(() => rmSync(folder, { recursive: true, force: true }));

/** Mulberry32: numbers from 0 to 1, the same for the same seed. */
function random(seed) {
  return () => {
    seed = (seed + 0x6d2b79f5) | 0;
    let t = Math.imul(seed ^ (seed >>> 15), 1 | seed);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 2 ** 32;
  };
}

/**
 * A pile whose items differ wildly within every category in the first eight numbers, and between categories in the
 * others: what is to be learned from past piles is to look past the first eight.
 */
function pile(categories, each, seed) {
  const next = random(seed);
  const centres = Array.from({ length: categories }, () => Array.from({ length: DIMENSION }, () => 2 * next() - 1));
  const rows = [];
  const labels = [];
  for (let item = 0; item < each * categories; item++) {
    const category = item % categories;
    rows.push(centres[category].map((x, j) => (j < 8 ? 4 * next() - 2 : x + 0.6 * next() - 0.3)));
    labels.push(category);
  }
  return { rows, labels };
}

const flat = (rows) => Float32Array.from(rows.flat());

function gathered(...piles) {
  const past = new PastPiles(options);
  for (const { rows, labels } of piles) past.addPile(flat(rows), Int32Array.from(labels));
  return past;
}

const throws = (action, code) =>
  assert.throws(action, (error) => {
    assert.equal(error.name, "KenspeckleError");
    assert.equal(error.code, code);
    assert.ok(error.message.length > 20);
    return true;
  });

test("native and wasm learn the same starter, byte for byte", () => {
  const past = [pile(9, 7, 1), pile(6, 5, 2)];
  const names = [];
  past.forEach(({ rows, labels }, number) => {
    writeFileSync(join(folder, `${number}.npy`), npy(rows));
    // The program takes categories by name; two digits keep their order.
    writeFileSync(join(folder, `${number}.csv`), labels.map((label) => `${number}-${String(label).padStart(2, "0")}\n`).join(""));
    names.push(`${number}.npy`);
  });
  const labels = past.flatMap((_, number) => ["--labels", `${number}.csv`]);
  execFileSync(program, ["learn", ...names, ...labels, "--out", "native.starter"], { cwd: folder, stdio: "ignore" });
  const native = readFileSync(join(folder, "native.starter"));

  // The program adds up each pile by itself, then the piles.
  const sums = past.map((one) => gathered(one).bytes());
  const merged = PastPiles.read(sums[0]);
  merged.merge(sums[1]);
  const learned = merged.learn();
  assert.equal(Buffer.compare(Buffer.from(learned.bytes()), native), 0);
  assert.deepEqual([learned.categories, learned.items, learned.encoder], [15, 93, "vectors"]);
  const read = Starter.read(native);
  assert.equal(read.identity, learned.identity);
  assert.match(read.identity, /^[0-9a-f]{16}$/);
});

test("a starter makes a new pile of the same kind come out better from one example each", () => {
  const starter = gathered(pile(30, 8, 3)).learn();
  const right = (with_) => {
    let share = 0;
    for (let seed = 100; seed < 120; seed++) {
      const { rows, labels } = pile(5, 20, seed);
      const sorter = new Sorter({ ...options, ...with_ });
      rows.forEach((row) => sorter.addItem(Float32Array.from(row)));
      const trays = [0, 1, 2, 3, 4].map((item) => sorter.answerNew(item, `category ${labels[item]}`));
      const { tray, status } = sorter.verdicts();
      const open = labels.filter((label, item) => status[item] === 0 && tray[item] === trays[label]);
      share += open.length / (labels.length - 5) / 20;
      sorter.free();
    }
    return share;
  };
  const without = right({});
  const with_ = right({ starter });
  assert.ok(with_ > without + 0.1, `${with_} with, ${without} without`);
});

test("gathering and learning tell how far they are", () => {
  const { rows, labels } = pile(9, 4, 5);
  const past = new PastPiles(options);
  for (const work of [(tell) => past.addPile(flat(rows), Int32Array.from(labels), tell), (tell) => past.learn(tell)]) {
    const told = [];
    work((done) => told.push(done));
    assert.ok(told.length >= 9 && told.every((done, index) => done >= (told[index - 1] ?? 0)), told.join());
    assert.equal(told.at(-1), 1);
  }
});

test("items without a category are left out", () => {
  const { rows, labels } = pile(5, 6, 6);
  const some = labels.map((label, item) => (item % 3 === 0 ? -1 : label));
  const only = { rows: rows.filter((_, item) => item % 3 !== 0), labels: labels.filter((_, item) => item % 3 !== 0) };
  const past = gathered({ rows, labels: some });
  assert.deepEqual([past.categories, past.items], [5, 20]);
  assert.deepEqual(past.bytes(), gathered(only).bytes());
});

describe("a sorter with a starter", () => {
  const { rows, labels } = pile(3, 6, 7);
  let starter;
  let sorter;
  before(() => {
    starter = gathered(pile(9, 4, 8)).learn();
    sorter = new Sorter({ ...options, starter });
    rows.forEach((row) => sorter.addItem(Float32Array.from(row)));
    for (const item of [0, 1, 2]) sorter.answerNew(item, `category ${labels[item]}`);
  });

  test("keeps its share when the caller's is freed", () => {
    const mine = starter.share();
    const other = new Sorter({ ...options, starter: mine });
    mine.free();
    other.addItem(Float32Array.from(rows[0]));
    assert.equal(other.starter, starter.identity);
  });

  test("comes back with it, and not without it or with another", () => {
    const state = sorter.state();
    assert.deepEqual(Sorter.restore(state, flat(rows), starter).verdicts(), sorter.verdicts());
    const another = gathered(pile(9, 4, 9)).learn();
    throws(() => Sorter.restore(state, flat(rows)), "state-unreadable");
    throws(() => Sorter.restore(state, flat(rows), another), "state-unreadable");
    const plain = new Sorter(options);
    throws(() => Sorter.restore(plain.state(), new Float32Array(0), starter), "state-unreadable");
  });

  test("changes it and changes back, with all answers and the log", () => {
    const before_ = sorter.verdicts();
    sorter.changeStarter(flat(rows));
    assert.equal(sorter.starter, undefined);
    const plain = new Sorter(options);
    rows.forEach((row) => plain.addItem(Float32Array.from(row)));
    for (const item of [0, 1, 2]) plain.answerNew(item, `category ${labels[item]}`);
    assert.deepEqual(sorter.verdicts(), plain.verdicts());
    assert.notDeepEqual(sorter.verdicts(), before_);
    throws(() => sorter.changeStarter(flat(rows.slice(1)), starter), "embedding-count");
    sorter.changeStarter(flat(rows), starter);
    assert.equal(sorter.starter, starter.identity);
    assert.deepEqual(sorter.verdicts(), before_);
    assert.equal(sorter.undo(), "answer");
    assert.equal(sorter.redo(), "answer");
  });
});

describe("refusals", () => {
  test("fewer than eight categories are not shared unless the caller insists", () => {
    const few = gathered(pile(7, 4, 10)).learn();
    throws(() => few.bytes(), "too-few-to-share");
    assert.equal(Starter.read(few.bytes(2)).identity, few.identity);
    assert.ok(gathered(pile(8, 4, 10)).learn().bytes().length > 0);
  });

  test("too little to learn from", () => {
    throws(() => gathered(pile(1, 9, 11)).learn(), "too-little-to-learn");
    throws(() => gathered(pile(9, 1, 11)).learn(), "too-little-to-learn");
  });

  test("what is no pile adds nothing", () => {
    const past = gathered(pile(3, 3, 12));
    const sums = past.bytes();
    const { rows, labels } = pile(3, 3, 13);
    throws(() => past.addPile(flat(rows).subarray(1), Int32Array.from(labels)), "label-count");
    rows[8][3] = NaN;
    throws(() => past.addPile(flat(rows), Int32Array.from(labels)), "not-finite");
    rows[8].fill(0);
    throws(() => past.addPile(flat(rows), Int32Array.from(labels)), "all-zero");
    assert.deepEqual(past.bytes(), sums);
  });

  test("another encoder's starters and sums", () => {
    const starter = gathered(pile(9, 4, 14)).learn();
    throws(() => new Sorter({ ...options, encoder: "another", starter }), "other-encoder");
    throws(() => new Sorter({ ...options, dimension: DIMENSION + 1, starter }), "starter-unreadable");
    throws(() => new Sorter({ ...options, starter: {} }), "options");
    const past = new PastPiles({ ...options, encoder: "another" });
    throws(() => past.merge(gathered(pile(2, 2, 15)).bytes()), "other-encoder");
    throws(() => new PastPiles({}), "options");
    throws(() => new PastPiles({ ...options, dimension: 1 }), "dimension-out-of-range");
  });

  test("files that are none, or cut off", () => {
    const past = gathered(pile(9, 4, 16));
    const starter = past.learn().bytes();
    const sums = past.bytes();
    for (let cut = 0; cut < starter.length; cut += 97) throws(() => Starter.read(starter.subarray(0, cut)), "starter-unreadable");
    for (let cut = 0; cut < sums.length; cut += 97) throws(() => past.merge(sums.subarray(0, cut)), "statistics-unreadable");
    throws(() => Starter.read(Buffer.from("words, not a starter")), "starter-unreadable");
    throws(() => Starter.read(sums), "starter-unreadable");
  });
});
