// Embeds photos with the WebAssembly module under Node: embed_photos.mjs BINDINGS_FOLDER ENCODER.onnx OUT.f32 < LIST
// LIST has one path a line; OUT.f32 gets one row of little-endian float32 a photo.
import { readFileSync, writeFileSync } from "node:fs";
import { pathToFileURL } from "node:url";
import { resolve } from "node:path";

const [folder, encoderFile, out] = process.argv.slice(2);
const { default: init, PhotoEncoder } = await import(pathToFileURL(resolve(folder, "kenspeckle.js")));
await init({ module_or_path: readFileSync(resolve(folder, "kenspeckle_bg.wasm")) });

let began = performance.now();
const encoder = new PhotoEncoder(readFileSync(encoderFile));
console.error(`${encoder.identity} loaded in ${Math.round(performance.now() - began)} ms`);

const rows = [];
const photos = readFileSync(0, "utf8").split("\n").filter(Boolean);
began = performance.now();
for (const name of photos) {
    try {
        const photo = encoder.read(readFileSync(name), 256);
        rows.push(Buffer.from(photo.embedding().buffer));
        photo.free();
    } catch (error) {
        throw new Error(`${name}: ${error.message ?? error}`);
    }
}
console.error(`${((performance.now() - began) / photos.length).toFixed(1)} ms a photo`);
writeFileSync(out, Buffer.concat(rows));
