// Notes in the WebAssembly module under Node: the embeddings of the native program, tables, and errors that programs can test.
// Needs the module in www/kit/wasm (pkg-scripts/build) and the program (cargo build --release --features cli).

import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { before, test } from "node:test";
import { fileURLToPath } from "node:url";

const root = fileURLToPath(new URL("../..", import.meta.url));
const target = process.env.CARGO_TARGET_DIR ?? join(root, "target");
const MOST_MEMORY = 150e6;

let NoteEncoder;
let readNoteTable;
let memory;

before(async () => {
  const module = await import(new URL("../../www/kit/wasm/kenspeckle.js", import.meta.url));
  ({ memory } = await module.default({ module_or_path: readFileSync(join(root, "www/kit/wasm/kenspeckle_bg.wasm")) }));
  ({ NoteEncoder, readNoteTable } = module);
});

const throws = (action, code) =>
  assert.throws(action, (error) => {
    assert.equal(error.name, "KenspeckleError");
    assert.equal(error.code, code);
    assert.ok(error.message.length > 20);
    return true;
  });

test("the demo pile: embeddings as the native program gives them, in the memory a page can spare", () => {
  const log = join(root, "www/demo/notes/log.csv");
  const folder = mkdtempSync(join(tmpdir(), "kenspeckle-"));
  const out = join(folder, "log.npy");
  execFileSync(join(target, "release", "kenspeckle"), ["embed", log, "--column", "note", "--out", out], { stdio: "ignore" });
  const file = readFileSync(out);
  const start = 10 + file.readUInt16LE(8);
  const native = new Float32Array(file.buffer.slice(file.byteOffset + start, file.byteOffset + file.length));
  rmSync(folder, { recursive: true, force: true });

  const encoder = new NoteEncoder(readFileSync(join(root, "www/encoders/text.onnx")));
  assert.equal(encoder.dimension, 384);
  assert.equal(encoder.nonNegative, false);
  assert.match(encoder.identity, /^all-minilm-l6-v2:[0-9a-f]{32}$/);
  const { columns, rows } = readNoteTable(readFileSync(log), "log.csv");
  const column = columns.indexOf("note");
  assert.ok(rows.length >= 150);
  assert.equal(native.length, rows.length * encoder.dimension);
  rows.forEach((row, index) => {
    const note = encoder.read(row[column]);
    const ours = note.embedding();
    const theirs = native.subarray(index * encoder.dimension);
    const cosine = ours.reduce((sum, x, i) => sum + x * theirs[i], 0);
    assert.ok(cosine > 0.9999, `${row[column]}: ${cosine}`);
    assert.equal(note.parts, 1);
    note.free();
  });
  const long = encoder.read("the tide was lower than the table says ".repeat(60));
  assert.deepEqual([long.tokens, long.parts], [480, 2]);
  assert.ok(memory.buffer.byteLength <= MOST_MEMORY, `${memory.buffer.byteLength} bytes`);
  throws(() => encoder.read(" \n"), "note-empty");
  throws(() => encoder.read("a ".repeat(60_000)), "note-too-long");
  encoder.free();
});

test("files of notes", () => {
  const bytes = (text) => new TextEncoder().encode(text);
  assert.deepEqual(readNoteTable(bytes("one\n\ntwo, three\n"), "notes.txt"), {
    columns: ["note"],
    rows: [["one"], ["two, three"]],
    lines: [1, 3],
    encoding: "UTF-8",
    troubles: [],
  });
  const table = readNoteTable(bytes('id;note\n1;"a;\nb"\n2;x;y\n3;c\n'), "Notes.CSV");
  assert.deepEqual(table.rows, [["1", "a;\nb"], ["3", "c"]]);
  assert.deepEqual(table.lines, [2, 5]);
  assert.equal(table.troubles.length, 1);
  assert.equal(readNoteTable(Uint8Array.of(0x63, 0x61, 0x66, 0xe9), "a.txt").encoding, "Windows-1252");
  throws(() => readNoteTable(Uint8Array.of(1, 0, 2), "a.txt"), "not-text");
  throws(() => readNoteTable(bytes(""), "a.txt"), "table-empty");
  throws(() => readNoteTable(bytes('a,"b\n1,2'), "a.csv"), "table-unreadable");
});

test("an encoder file that is none", () => {
  throws(() => new NoteEncoder(new Uint8Array(100)), "encoder-file");
  throws(() => new NoteEncoder(readFileSync(join(root, "www/encoders/photo.onnx"))), "encoder-file");
});
