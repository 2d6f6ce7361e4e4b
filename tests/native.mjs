// What tests of the WebAssembly module share: the module, the native program, and files that both understand.

import { readFileSync } from "node:fs";
import { join } from "node:path";
import { fileURLToPath } from "node:url";

export const root = fileURLToPath(new URL("..", import.meta.url));
const target = process.env.CARGO_TARGET_DIR ?? join(root, "target");
export const program = join(target, "release", "kenspeckle");

/** The module in www/kit/wasm, started. */
export async function core() {
  const module = await import(new URL("../www/kit/wasm/kenspeckle.js", import.meta.url));
  await module.default({ module_or_path: readFileSync(join(root, "www/kit/wasm/kenspeckle_bg.wasm")) });
  return module;
}

/** Rows of equal length as an NPY file, format 1.0, little-endian float32. */
export function npy(rows) {
  const dictionary = `{'descr': '<f4', 'fortran_order': False, 'shape': (${rows.length}, ${rows[0].length}), }`;
  const header = dictionary.padEnd(128 - 10 - 1) + "\n";
  const start = Buffer.from([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0, header.length, 0]);
  return Buffer.concat([start, Buffer.from(header, "latin1"), Buffer.from(Float32Array.from(rows.flat()).buffer)]);
}
