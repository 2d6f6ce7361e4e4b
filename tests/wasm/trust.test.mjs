// Trust in the WebAssembly module: terms, assessment, doubts and spot checks as plain objects.
// Needs the module in www/kit/wasm (pkg-scripts/build).

import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { before, test } from "node:test";
import { fileURLToPath } from "node:url";

const root = fileURLToPath(new URL("../..", import.meta.url));
let Sorter;
let SpotCheck;

before(async () => {
  const module = await import(new URL("../../www/kit/wasm/kenspeckle.js", import.meta.url));
  await module.default({ module_or_path: readFileSync(`${root}www/kit/wasm/kenspeckle_bg.wasm`) });
  ({ Sorter, SpotCheck } = module);
});

/** Numbers from 0 to 1 that are the same every time (a linear congruential generator; the constants of Numerical Recipes). */
function numbers(seed) {
  let state = seed;
  return () => (state = (state * 1664525 + 1013904223) % 2 ** 32) / 2 ** 32;
}

/** A pile of items around corners of a cube, the first `answered` of each corner answered. */
function pile(corners, size, answered, dimension = 16) {
  const random = numbers(7);
  const sorter = new Sorter({ encoder: "e", dimension, nonNegative: false });
  for (let corner = 0; corner < corners; corner++) {
    const tray = sorter.addTray(`corner ${corner}`);
    for (let k = 0; k < size; k++) {
      const row = Float32Array.from({ length: dimension }, (_, j) => (j === corner ? 1 : 0) + 0.5 * (random() - 0.5));
      const item = sorter.addItem(row);
      if (k < answered) sorter.answer(item, tray);
    }
  }
  return sorter;
}

test("verdicts say what is plausible and what is set aside", () => {
  const sorter = pile(4, 20, 6);
  const stranger = sorter.addItem(Float32Array.from({ length: 16 }, (_, j) => (j === 12 ? 1 : 0.01)));
  const { setAside, likeness, tray, status } = sorter.verdicts();
  assert.ok(setAside instanceof Uint8Array && likeness instanceof Float32Array);
  assert.equal(setAside[stranger], 1);
  const open = [...tray.keys()].filter((item) => status[item] === 0 && item !== stranger);
  assert.ok(open.every((item) => likeness[item] > likeness[stranger]));
  assert.ok(open.filter((item) => setAside[item] > 0).length <= open.length / 8);
  const first = open.find((item) => setAside[item] === 0);
  assert.equal(sorter.plausible(first)[0], tray[first]);
  assert.deepEqual([...sorter.plausible(0)], [0]);
  const { starts, trays } = sorter.plausibleSets();
  assert.ok(starts instanceof Uint32Array && trays instanceof Uint32Array && starts.length === tray.length + 1);
  for (const item of tray.keys()) {
    assert.deepEqual([...trays.subarray(starts[item], starts[item + 1])], [...sorter.plausible(item)]);
  }

  assert.deepEqual(sorter.terms, { confidence: 0.9, setAsideShare: 0.05, onlySure: false });
  sorter.setTerms({ confidence: 0.8, setAsideShare: 0, onlySure: false });
  assert.equal(sorter.verdicts().setAside[stranger], 0);
  assert.deepEqual(sorter.terms, { confidence: 0.8, setAsideShare: 0, onlySure: false });
  for (const bad of [{}, { confidence: 1, setAsideShare: 0, onlySure: false }, { confidence: 0.9, setAsideShare: 0.6, onlySure: false }]) {
    assert.throws(() => sorter.setTerms(bad), (error) => ["terms", "options"].includes(error.code));
  }
  const same = Sorter.restore(sorter.state(), new Float32Array(0).length ? [] : embeddings(4, 20, stranger));
  assert.deepEqual(same.terms, sorter.terms);

  /** The embeddings of that pile once more. */
  function embeddings(corners, size, last) {
    const random = numbers(7);
    const rows = [];
    for (let corner = 0; corner < corners; corner++) {
      for (let k = 0; k < size; k++) {
        for (let j = 0; j < 16; j++) rows.push((j === corner ? 1 : 0) + 0.5 * (random() - 0.5));
      }
    }
    for (let j = 0; j < 16; j++) rows.push(j === 12 ? 1 : 0.01);
    assert.equal(rows.length / 16 - 1, last);
    return Float32Array.from(rows);
  }
});

test("the assessment and the doubts name what is wrong", () => {
  const sorter = pile(4, 20, 6);
  // The first item of corner 0 is put with corner 2.
  sorter.answer(0, 2);
  const { share, trays, confusions, calibration, unknown, curve, answers } = sorter.assessment();
  assert.equal(answers, 24);
  assert.deepEqual([share.right, share.judged], [23, 24]);
  // statsmodels 0.15.0: proportion_confint(23, 24, method="wilson"), scipy 1.17.1: binomtest(23, 24).proportion_ci(method="exact")
  assert.ok(Math.abs(share.wilson.low - 0.797582) < 1e-6 && Math.abs(share.exact.low - 0.788798) < 1e-6, JSON.stringify(share));
  assert.equal(trays.length, 4);
  assert.deepEqual(confusions, [{ tray: 2, takenFor: 0, items: [0] }]);
  assert.ok(calibration.error >= 0 && calibration.brier >= 0 && calibration.logLoss >= 0);
  assert.deepEqual(unknown, []);
  assert.ok(curve.points.length >= 2);
  assert.ok(curve.ahead.length > 2 && curve.ahead[0].more === 0 && curve.ahead.every(({ low, likely, high }) => low <= likely && likely <= high));
  assert.equal(share.value, 23 / 24);
  assert.equal(calibration.bins.reduce((sum, { items }) => sum + items, 0), 24);
  assert.ok(Math.abs(calibration.bins.reduce((sum, { items, said, right }) => sum + items * Math.abs(said - right), 0) / 24 - calibration.error) < 1e-12);
  const more = sorter.moreAnswers(0.99);
  assert.equal(more.target, 0.99);
  assert.ok(more.low >= 0 && (more.likely === null || more.likely >= more.low));

  const [doubt] = sorter.doubts();
  assert.equal(doubt.item, 0);
  assert.equal(doubt.tray, 2);
  assert.equal(doubt.rather, 0);
  assert.equal(doubt.why, "contradicted");
  sorter.settleDoubt(0, 2);
  assert.ok(sorter.doubts().every(({ item }) => item !== 0));
  assert.equal(sorter.undo(), "keep");
  sorter.settleDoubt(0, 0);
  assert.ok(sorter.doubts().every(({ item }) => item !== 0));
  assert.equal(sorter.undo(), "answer");
  assert.equal(sorter.doubts()[0].item, 0);
});

test("nothing is known yet of trays with a single answer", () => {
  const sorter = pile(3, 5, 1);
  const { share, calibration, unknown, curve } = sorter.assessment();
  assert.equal(share.judged, 0);
  assert.deepEqual([calibration, unknown, curve], [null, [0, 1, 2], null]);
  assert.equal(sorter.moreAnswers(0.9), undefined);
  assert.equal(new Sorter({ encoder: "e", dimension: 3, nonNegative: false }).assessment(), undefined);
});

test("a spot check from the draw to the sentence", () => {
  const sorter = pile(4, 60, 6);
  const plan = { tolerance: 0.05, confidence: 0.95 };
  const check = sorter.spotCheck(plan, 4711);
  const size = sorter.spotCheckSize(plan);
  assert.equal(check.left, size);
  const sample = check.sample();
  assert.equal(sample.length, size);
  assert.ok(sample.every(({ judgement }) => judgement === null));
  assert.throws(() => check.statement("2026-12-01"), (error) => error.code === "spot-check-unfinished");
  for (const { item } of sample) check.judge(item, "right");
  check.judge(sample[0].item, { belongs: 3 - sample[0].tray });
  check.judge(sample[1].item, "wrong");
  check.judge(sample[1].item, null);
  assert.equal(check.left, 1);
  check.judge(sample[1].item, "untold");
  const kept = SpotCheck.restore(check.state());
  for (const one of [check, kept]) {
    const statement = one.statement("2026-12-01");
    assert.equal(statement.wrong, 1);
    assert.equal(statement.untold, 1);
    assert.equal(statement.lookedAt, size);
    assert.equal(statement.seed, 4711);
    assert.equal(statement.holds, false);
    assert.ok(Math.abs(statement.share - statement.atMost / statement.items) < 1e-12);
    assert.equal(one.items, statement.items);
    assert.deepEqual(one.plan, { tolerance: 0.05, confidence: 0.95, allowed: 0, byTray: false });
    assert.match(statement.sentence, /^At most \d+\.\d % of the \d+ sorted items are in the wrong tray \(95 % confidence, .* seed 4711, 2026-12-01\)$/);
  }
  assert.equal(check.corrected().find(({ item }) => item === sample[0].item).tray, 3 - sample[0].tray);
  assert.throws(() => check.judge(0, "right"), (error) => error.code === "not-in-sample");
  const { tray } = sorter.verdicts();
  assert.equal(sorter.isAboutNow(check), false);
  sorter.answerChecked(check);
  assert.equal(sorter.isAboutNow(check), true);
  const now = sorter.verdicts();
  for (const { item, tray: corrected } of check.corrected()) assert.equal(now.tray[item], corrected ?? -1);
  assert.ok([...tray.keys()].every((item) => now.tray[item] === tray[item] || item === sample[0].item));
  assert.deepEqual([now.status[sample[1].item], now.status[sample[2].item]], [3, 1]);
  assert.equal(sorter.undo(), "spot-check");
  assert.equal(sorter.isAboutNow(check), false);
  assert.throws(() => check.judge(sample[0].item, "perhaps"), (error) => error.code === "options");
  assert.throws(() => sorter.spotCheck({ tolerance: 2, confidence: 0.95 }, 1), (error) => error.code === "spot-check-plan");
  assert.throws(() => sorter.spotCheck(plan, -1), (error) => error.code === "options");
  assert.throws(() => SpotCheck.restore("{}"), (error) => error.code === "state-unreadable");
});
