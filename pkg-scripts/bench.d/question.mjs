// Times how long the WebAssembly module takes, under Node, from an answer to the next question, and to all that the page shows
// after an answer.
//
//   node question.mjs WASM_FOLDER     reads the job as JSON from standard input, prints the milliseconds of each answer as JSON
import { readFileSync } from "node:fs";
import { join, resolve } from "node:path";
import { pathToFileURL } from "node:url";

const folder = resolve(process.argv[2]);
const { dimension, categories, items, answers, seed } = JSON.parse(readFileSync(0, "utf8"));
const { default: load, Sorter } = await import(pathToFileURL(join(folder, "kenspeckle.js")));
const module = await load({ module_or_path: readFileSync(join(folder, "kenspeckle_bg.wasm")) });

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

/** By the clock, and of the processor, which hardly minds a busy machine. */
function timed(work) {
  const start = performance.now();
  const used = process.cpuUsage();
  const result = work();
  const { user, system } = process.cpuUsage(used);
  return [{ clock: performance.now() - start, processor: (user + system) / 1000 }, result];
}

const sum = (a, b) => ({ clock: a.clock + b.clock, processor: a.processor + b.processor });

const sorter = new Sorter({ encoder: "benchmark", dimension, nonNegative: true });
const [adding] = timed(() => {
  for (let number = 0; number < items; number += 1) sorter.addItem(item(number % categories));
});
let [first, question] = timed(() => sorter.nextQuestion());
for (let category = 0; category < categories; category += 1) sorter.addTray(`category ${category}`);
const next = [];
const whole = [];
for (let answer = 0; answer < answers; answer += 1) {
  sorter.answer(question, question % categories);
  const [verdicts] = timed(() => sorter.verdicts());
  const [asking, asked] = timed(() => sorter.nextQuestion());
  const [rest] = timed(() => [sorter.bestStrip(), sorter.outlook()]);
  next.push(sum(verdicts, asking));
  whole.push({ answer: answer + 1, verdicts, asking, rest });
  question = asked;
}
console.log(JSON.stringify({ adding, first, next, whole, memory: module.memory.buffer.byteLength }));
