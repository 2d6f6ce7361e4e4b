// Draws the icon sets: every name that enough of the icon collections share is a category, every collection one style of
// drawing it, at OUT/icons-test/<name>/<style>.png for the names kept for testing and OUT/icons-learn/… for the others.
// Files that are already there are kept, so an interrupted run goes on.
//
//   node render-icons.mjs NODE_FOLDER OUT
//
// NODE_FOLDER is the folder in which `sharp` and the `@iconify-json/…` packages are installed.
import { existsSync, mkdirSync, renameSync } from "node:fs";
import { createRequire } from "node:module";
import { join, resolve } from "node:path";

const STYLES = ["noto", "noto-v1", "twemoji", "openmoji", "fluent-emoji", "fluent-emoji-flat", "emojione", "emojione-v1", "fxemoji"];
const LEAST_STYLES = 8;
const SIDE = 224;
const MARGIN = 18; // 8 % of the side
const INNER = SIDE - 2 * MARGIN;

const [nodeFolder, out] = process.argv.slice(2).map((path) => resolve(path));
const fromNodeFolder = createRequire(join(nodeFolder, "package.json"));
const sharp = fromNodeFolder("sharp");
sharp.concurrency(1);

const collections = STYLES.map((style) => ({ style, ...fromNodeFolder(`@iconify-json/${style}/icons.json`) }));
const stylesOfName = new Map();
for (const { icons } of collections)
  for (const name of Object.keys(icons)) stylesOfName.set(name, (stylesOfName.get(name) ?? 0) + 1);
const names = [...stylesOfName].filter(([, styles]) => styles >= LEAST_STYLES).map(([name]) => name).sort();
// Every third name in sorted order is kept for testing: nothing is ever learned from it.
const folderOf = new Map(names.map((name, place) => [name, join(out, place % 3 === 0 ? "icons-test" : "icons-learn", name)]));

function drawing(collection, icon) {
  const left = icon.left ?? collection.left ?? 0;
  const top = icon.top ?? collection.top ?? 0;
  const width = icon.width ?? collection.width ?? 16;
  const height = icon.height ?? collection.height ?? 16;
  return `<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" width="${INNER}" height="${INNER}"
    viewBox="${left} ${top} ${width} ${height}">${icon.body}</svg>`;
}

let drawn = 0;
let leftOut = 0;
for (const name of names) {
  const folder = folderOf.get(name);
  mkdirSync(folder, { recursive: true });
  for (const collection of collections) {
    const icon = collection.icons[name];
    const file = join(folder, `${collection.style}.png`);
    if (!icon || existsSync(file)) continue;
    try {
      await sharp(Buffer.from(drawing(collection, icon)))
        .resize(INNER, INNER, { fit: "contain", background: "#ffffff" })
        .flatten({ background: "#ffffff" })
        .extend({ top: MARGIN, bottom: MARGIN, left: MARGIN, right: MARGIN, background: "#ffffff" })
        .png({ compressionLevel: 6 })
        .toFile(`${file}.tmp`);
      renameSync(`${file}.tmp`, file);
      drawn += 1;
    } catch (error) {
      leftOut += 1;
      console.error(`icons: ${collection.style}/${name} left out: ${error.message}`);
    }
  }
}
console.log(`icons: ${names.length} names; ${drawn} pictures drawn now${leftOut ? `, ${leftOut} left out` : ""}`);
