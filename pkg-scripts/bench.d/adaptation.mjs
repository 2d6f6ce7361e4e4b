// Times how long the WebAssembly module takes, under Node, from an answer to the sorted items, for each learner.
//
//   node adaptation.mjs WASM_FOLDER     reads the job as JSON from standard input, prints {learner: [milliseconds…]} as JSON
import { readFileSync } from "node:fs";
import { join, resolve } from "node:path";
import { pathToFileURL } from "node:url";

const folder = resolve(process.argv[2]);
const { dimension, categories, examples, learners, rounds, warmUp, seed } = JSON.parse(readFileSync(0, "utf8"));
const { default: load, Sorter } = await import(pathToFileURL(join(folder, "kenspeckle.js")));
await load({ module_or_path: readFileSync(join(folder, "kenspeckle_bg.wasm")) });

// Mulberry32: the same numbers on every machine.
let state = seed;
function random() {
  state = (state + 0x6d2b79f5) | 0;
  let t = Math.imul(state ^ (state >>> 15), 1 | state);
  t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
  return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
}

// Never-negative vectors whose categories overlap: each shares half of every item.
const middles = Array.from({ length: categories }, () => Float32Array.from({ length: dimension }, () => random() ** 4));
const item = (category) => Float32Array.from(middles[category], (x) => x + random() ** 4);

const times = {};
const sorters = learners.map((learner) => {
  times[learner] = [];
  const sorter = new Sorter({ encoder: "benchmark", dimension, nonNegative: true, learner });
  for (let category = 0; category < categories; category += 1) sorter.addTray(`category ${category}`);
  return { learner, sorter };
});
for (let example = 0; example < examples; example += 1)
  for (let category = 0; category < categories; category += 1) {
    const embedding = item(category);
    for (const { sorter } of sorters) sorter.answer(sorter.addItem(embedding), category);
  }
// Turn by turn, so that a busy moment of the machine meets all learners alike.
for (let round = 0; round < warmUp + rounds; round += 1)
  for (const { learner, sorter } of sorters) {
    const answered = round % (categories * examples);
    sorter.withdraw(answered);
    sorter.answer(answered, answered % categories);
    const start = performance.now();
    sorter.verdicts();
    if (round >= warmUp) times[learner].push(performance.now() - start);
  }
console.log(JSON.stringify(times));
