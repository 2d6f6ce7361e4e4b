import init from './wasm/kenspeckle.js';
import { KenspeckleError, messageOf } from './error';

export { NoteEncoder, PastPiles, PhotoEncoder, readNoteTable, Sorter, SpotCheck, Starter } from './wasm/kenspeckle.js';
export type { Assessment, Doubt, Interval, Judgement, LearningCurve, PlausibleSets, Projection, Sampled, Share, SpotCheckPlan, Statement, Terms } from './wasm/kenspeckle.js';
export type { Hindsight, HindsightPoint, NoteTable, Outlook, ShareRange, Strip } from './wasm/kenspeckle.js';

/** Where the heavy files are. All can be served from anywhere on the page's own origin. */
export interface Assets {
  wasm: URL;
  photoEncoder: URL;
  /** Fetched only when the first note arrives. */
  textEncoder: URL;
  /** Its size, to tell how much of it has come: a compressed transfer doesn't say. */
  textEncoderBytes: number;
  /** Its identity, which is needed before it is fetched. */
  textIdentity: string;
}

export const bundledAssets: Assets = {
  wasm: new URL('./wasm/kenspeckle_bg.wasm', import.meta.url),
  photoEncoder: new URL('../encoders/photo.onnx', import.meta.url),
  textEncoder: new URL('../encoders/text.onnx', import.meta.url),
  textEncoderBytes: 22_662_986,
  textIdentity: 'all-minilm-l6-v2:010db948e469fd48d77e6d50fe5ab6b9',
};

/** What the items of a pile are. */
export type Kind = 'photos' | 'notes';

/** The kind of items whose embeddings an encoder makes, by its identity. */
export function kindOf(encoder: string): Kind {
  return encoder.startsWith('all-minilm-l6-v2:') ? 'notes' : 'photos';
}

async function get(url: URL): Promise<Response> {
  const remedy = 'Connect once, then try again; after that it works without a network.';
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

/** Where `fetchKept` keeps files on the device. */
const KEPT = 'text-encoder';

/**
 * Fetches a large file once: afterwards it comes from the device, with the network cut too. The service worker leaves it
 * alone, since it may not be in charge yet when the file is wanted first.
 */
export async function fetchKept(url: URL, report: (done: number) => void): Promise<Uint8Array<ArrayBuffer>> {
  const cache = await globalThis.caches?.open(KEPT).catch(() => undefined);
  const kept = await cache?.match(url);
  if (kept) return new Uint8Array(await kept.arrayBuffer());
  const bytes = await fetchWatched(url, report);
  // Where there is no room it is fetched again next time.
  await cache?.put(url, new Response(bytes, { headers: { 'content-type': 'application/octet-stream' } })).then(
    async () => {
      // Of an earlier version.
      for (const other of await cache.keys()) if (other.url !== url.href) await cache.delete(other);
    },
    () => undefined,
  );
  return bytes;
}

async function fetchWatched(url: URL, report: (done: number) => void): Promise<Uint8Array<ArrayBuffer>> {
  report(0);
  const reader = (await get(url)).body?.getReader();
  const parts: Uint8Array<ArrayBuffer>[] = [];
  let done = 0;
  let reported = 0;
  for (;;) {
    const part = await reader?.read().catch((error: unknown) => {
      throw new KenspeckleError('asset-missing', `Loading ${url.pathname} broke off: ${messageOf(error)}. Connect, then try again.`);
    });
    if (!part || part.done) break;
    parts.push(part.value);
    done += part.value.length;
    if (done - reported < 1 << 18) continue;
    reported = done;
    report(done);
  }
  const bytes = new Uint8Array(done);
  let at = 0;
  for (const part of parts) {
    bytes.set(part, at);
    at += part.length;
  }
  return bytes;
}

/** Makes the classes of this file usable in the calling thread. */
export async function startCore(module: WebAssembly.Module): Promise<void> {
  await init({ module_or_path: module });
}
