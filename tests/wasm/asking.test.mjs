// Strips and the comparison with random order in the WebAssembly module under Node.
// Needs the module in www/kit/wasm (pkg-scripts/build).

import assert from "node:assert/strict";
import { before, describe, test } from "node:test";
import { core } from "../native.mjs";

let Sorter;

before(async () => {
  ({ Sorter } = await core());
});

const DIMENSION = 12;
const CATEGORIES = 4;

/** Around one axis a category, by Weyl's sequence: spread out, and without a trend over the items. */
function embedding(item) {
  const noise = (j) => (((item * DIMENSION + j + 1) * 0.618034) % 1) - 0.5;
  return Float32Array.from({ length: DIMENSION }, (_, j) => noise(j) + (j === item % CATEGORIES ? 1 : 0));
}

function asked(items, answers) {
  const sorter = new Sorter({ encoder: "test", dimension: DIMENSION, nonNegative: false });
  for (let item = 0; item < items; item += 1) sorter.addItem(embedding(item));
  const trays = Array.from({ length: CATEGORIES }, (_, category) => sorter.addTray(`category ${category}`));
  for (let answer = 0; answer < answers; answer += 1) {
    const item = sorter.nextQuestion();
    sorter.answer(item, trays[item % CATEGORIES]);
  }
  return { sorter, trays };
}

describe("strips", () => {
  test("there is none before two trays have an answer", () => {
    const { sorter } = asked(40, 1);
    assert.equal(sorter.bestStrip(), undefined);
    assert.equal(sorter.outlook(), undefined);
  });

  test("they hold 4 to 12 items of one tray, and go into an old or a new one as one step", () => {
    const { sorter } = asked(80, 8);
    const { tray, items, due } = sorter.bestStrip();
    assert.ok(items.length >= 4 && items.length <= 12);
    assert.equal(typeof due, "boolean");
    const { tray: trays, status } = sorter.verdicts();
    for (const item of items) assert.deepEqual([trays[item], status[item]], [tray, 0]);
    const fresh = sorter.answerAllNew(Uint32Array.from(items), "others");
    const named = () => sorter.trays().find(({ name }) => name === "others");
    assert.deepEqual(named(), { tray: fresh, name: "others", answers: items.length });
    assert.throws(() => sorter.answerAllNew(Uint32Array.from(items), "Others"), { code: "tray-name-taken" });
    assert.equal(sorter.undo(), "answer");
    assert.equal(named(), undefined);
    assert.deepEqual(sorter.bestStrip(), { tray, items, due });
  });
});

describe("random order", () => {
  test("too little to tell is said", () => {
    assert.throws(() => asked(40, 1).sorter.hindsight(), { code: "too-little-to-tell" });
  });

  test("the same every time, with its progress, and nothing is changed", () => {
    const { sorter } = asked(80, 10);
    const state = sorter.state();
    const told = [];
    const found = sorter.hindsight((done) => told.push(done));
    assert.equal(told.at(-1), 1);
    assert.ok(told.every((done, index) => done >= (told[index - 1] ?? 0) && done <= 1));
    assert.deepEqual(sorter.hindsight(), found);
    assert.equal(sorter.state(), state);
    assert.equal(found.given, 10);
    assert.deepEqual(found.reached, sorter.outlook().now);
    assert.deepEqual(found.own.at(-1), { answers: 10, right: found.reached.expected });
    assert.ok(found.inRandomOrder.every(({ answers, right }) => answers <= found.tried && right >= 0 && right <= 1));
    if (found.random !== undefined) assert.ok(found.least === undefined || found.least <= found.random);
  });
});
