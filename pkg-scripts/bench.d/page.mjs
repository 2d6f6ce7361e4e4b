// Measures the page in the system's Chromium and prints one JSON object. Started by page.py, which prepares the folder DATA.
//
//   node page.mjs ROOT NODE_FOLDER DATA
import { existsSync, readFileSync, statSync } from "node:fs";
import { createServer } from "node:http";
import { createRequire } from "node:module";
import { delimiter, extname, join, resolve, sep } from "node:path";
import { brotliCompressSync, constants } from "node:zlib";
import { manyNotes } from "./page/many-notes.mjs";

const [root, nodeFolder, data] = process.argv.slice(2).map((path) => resolve(path));
const fromNodeFolder = createRequire(join(nodeFolder, "package.json"));
const { chromium } = fromNodeFolder("playwright-core");
const TYPES = {
  ".css": "text/css",
  ".csv": "text/csv; charset=utf-8",
  ".html": "text/html",
  ".ico": "image/x-icon",
  ".jpg": "image/jpeg",
  ".js": "text/javascript",
  ".json": "application/json",
  ".mjs": "text/javascript",
  ".png": "image/png",
  ".svg": "image/svg+xml",
  ".wasm": "application/wasm",
  ".webmanifest": "application/manifest+json",
  ".webp": "image/webp",
  ".woff2": "font/woff2",
};

/** Serves folders by their URL prefix from this machine to itself; `onRequest` hears of every file sent. */
async function serve(folders, onRequest = () => {}) {
  const server = createServer((request, response) => {
    const path = decodeURIComponent(new URL(request.url, "http://localhost").pathname);
    const [prefix, folder] = folders.find(([start]) => path.startsWith(start)) ?? [];
    let file = folder && resolve(folder, path.slice(prefix.length));
    if (file && existsSync(file) && statSync(file).isDirectory()) file = join(file, "index.html");
    if (!file || !(file === folder || file.startsWith(folder + sep)) || !existsSync(file)) {
      response.writeHead(404).end();
      return;
    }
    onRequest(path, file);
    response.writeHead(200, { "content-type": TYPES[extname(file)] ?? "application/octet-stream" }).end(readFileSync(file));
  });
  await new Promise((listening) => server.listen(0, "127.0.0.1", listening));
  return { server, origin: `http://localhost:${server.address().port}` };
}

function findChromium() {
  for (const folder of process.env.PATH.split(delimiter))
    for (const name of ["chromium", "chromium-browser", "google-chrome"])
      if (existsSync(join(folder, name))) return join(folder, name);
  throw new Error("there is no Chromium on the PATH: install the package `chromium`");
}

/** What a first visit fetches until the page is quiet and its service worker has all it keeps. */
async function firstVisit(browser, dist) {
  const sent = new Map();
  const { server, origin } = await serve([["/", dist]], (path, file) => sent.set(path, file));
  const context = await browser.newContext();
  const page = await context.newPage();
  const elsewhere = [];
  context.on("request", (request) => {
    if (!request.url().startsWith(origin) && /^https?:/.test(request.url())) elsewhere.push(request.url());
  });
  await page.goto(origin, { waitUntil: "networkidle" });
  // Quiet for a while: the encoder may arrive after the first paint.
  const settle = async () => {
    for (let before = -1; before !== sent.size; ) {
      before = sent.size;
      await page.waitForTimeout(1500);
    }
  };
  await settle();
  const offline = await page.evaluate(async (patience) => {
    if (!("serviceWorker" in navigator) || (await navigator.serviceWorker.getRegistrations()).length === 0) return false;
    const tooLong = new Promise((done) => setTimeout(() => done(false), patience));
    return Promise.race([navigator.serviceWorker.ready.then(() => true), tooLong]);
  }, 20_000);
  await settle();
  await context.close();
  server.close();
  const files = [...new Set(sent.values())].map((file) => {
    const raw = readFileSync(file);
    const brotli = brotliCompressSync(raw, {
      params: { [constants.BROTLI_PARAM_QUALITY]: 11, [constants.BROTLI_PARAM_LGWIN]: 22, [constants.BROTLI_PARAM_SIZE_HINT]: raw.length },
    }).length;
    return { file: file.slice(dist.length + 1), raw: raw.length, wire: Math.min(brotli, raw.length) };
  });
  files.sort((a, b) => b.wire - a.wire);
  return { files, offline, elsewhere };
}

const browser = await chromium.launch({
  executablePath: findChromium(),
  args: ["--no-sandbox", "--disable-gpu", "--disable-background-networking", "--disable-component-update", "--disable-sync"],
});
try {
  const { server, origin } = await serve([
    ["/kit/wasm/", join(root, "www/kit/wasm")],
    ["/encoders/", join(root, "www/encoders")],
    ["/ort/", join(nodeFolder, "node_modules/onnxruntime-web/dist")],
    ["/data/", data],
    ["/", join(root, "pkg-scripts/bench.d/page")],
  ]);
  const page = await browser.newPage();
  page.on("pageerror", (error) => console.error(error.message));
  await page.goto(origin);
  await page.waitForFunction("window.ready", undefined, { timeout: 20_000 });
  const job = JSON.parse(readFileSync(join(data, "job.json")));
  const result = { browser: browser.version() };
  result.photos = await page.evaluate((options) => window.measure.photos(options), job.photos);
  // A page of its own, so that the memory is that of notes alone.
  const other = await browser.newPage();
  await other.goto(origin);
  await other.waitForFunction("window.ready", undefined, { timeout: 20_000 });
  result.notes = await other.evaluate((options) => window.measure.notes(options), job.notes);
  await other.close();
  result.answers = await page.evaluate((options) => window.measure.answers(options), job.answers);
  result.learning = await page.evaluate((options) => window.measure.learning(options), job.learning);
  server.close();
  const dist = join(root, "www/app/dist");
  if (existsSync(dist)) {
    const { server: app, origin: address } = await serve([["/", dist]]);
    result.manyNotes = await manyNotes(browser, address, job.manyNotes);
    app.close();
    result.firstVisit = await firstVisit(browser, dist);
  }
  console.log(JSON.stringify(result));
} finally {
  await browser.close();
}
