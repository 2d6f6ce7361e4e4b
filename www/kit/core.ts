import init from './wasm/kenspeckle.js';
import { KenspeckleError, messageOf } from './error';

export { NoteEncoder, PastPiles, PhotoEncoder, readNoteTable, Sorter, SpotCheck, Starter } from './wasm/kenspeckle.js';
export type { Assessment, Doubt, Interval, Judgement, LearningCurve, PlausibleSets, Projection, Sampled, Share, SpotCheckPlan, Statement, Terms } from './wasm/kenspeckle.js';
export type { NoteTable } from './wasm/kenspeckle.js';

/** Where the heavy files are. All can be served from anywhere on the page's own origin. */
export interface Assets {
  wasm: URL;
  photoEncoder: URL;
  /** Fetched only when the first note arrives. */
  textEncoder: URL;
}

export const bundledAssets: Assets = {
  wasm: new URL('./wasm/kenspeckle_bg.wasm', import.meta.url),
  photoEncoder: new URL('../encoders/photo.onnx', import.meta.url),
  textEncoder: new URL('../encoders/text.onnx', import.meta.url),
};

async function get(url: URL): Promise<Response> {
  const remedy = 'Connect once and reload the page; after that it works without a network.';
  let response: Response;
  try {
    response = await fetch(url);
  } catch (error) {
    throw new KenspeckleError('asset-missing', `Could not load ${url.pathname}: ${messageOf(error)}. ${remedy}`);
  }
  if (!response.ok) throw new KenspeckleError('asset-missing', `Could not load ${url.pathname}: the server said ${response.status}.`);
  return response;
}

const compiled = new Map<string, Promise<WebAssembly.Module>>();

/** Compiles the module off the main thread, once; the result can be posted to any number of workers. */
export async function compileCore(url: URL): Promise<WebAssembly.Module> {
  const module = compiled.get(url.href) ?? compile(url);
  compiled.set(url.href, module);
  // The next one who asks tries again.
  module.catch(() => compiled.delete(url.href));
  return module;
}

async function compile(url: URL): Promise<WebAssembly.Module> {
  const response = await get(url);
  // Static servers that don't know .wasm would make the streaming compiler refuse it.
  if (response.headers.get('content-type')?.startsWith('application/wasm')) return WebAssembly.compileStreaming(response);
  return WebAssembly.compile(await response.arrayBuffer());
}

export async function fetchBytes(url: URL): Promise<Uint8Array<ArrayBuffer>> {
  return new Uint8Array(await (await get(url)).arrayBuffer());
}

/** Makes the classes of this file usable in the calling thread. */
export async function startCore(module: WebAssembly.Module): Promise<void> {
  await init({ module_or_path: module });
}
