// Embeds notes with the WebAssembly module under Node: embed_notes.mjs BINDINGS_FOLDER ENCODER.onnx NOTES.json OUT.f32
// NOTES.json holds an array of strings; OUT.f32 gets one row of little-endian float32 a note.
import { readFileSync, writeFileSync } from "node:fs";
import { pathToFileURL } from "node:url";
import { resolve } from "node:path";

const [folder, encoderFile, notesFile, out] = process.argv.slice(2);
const { default: init, NoteEncoder } = await import(pathToFileURL(resolve(folder, "kenspeckle.js")));
const { memory } = await init({ module_or_path: readFileSync(resolve(folder, "kenspeckle_bg.wasm")) });

let began = performance.now();
const encoder = new NoteEncoder(readFileSync(encoderFile));
console.error(`${encoder.identity} loaded in ${Math.round(performance.now() - began)} ms`);

const rows = [];
const notes = JSON.parse(readFileSync(notesFile, "utf8"));
began = performance.now();
for (const text of notes) {
    const note = encoder.read(text);
    rows.push(Buffer.from(note.embedding().buffer));
    note.free();
}
const each = ((performance.now() - began) / notes.length).toFixed(1);
console.error(`${each} ms a note; memory of the module ${Math.round(memory.buffer.byteLength / 1e6)} MB`);
writeFileSync(out, Buffer.concat(rows));
