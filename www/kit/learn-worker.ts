import { expose } from './bridge';
import { PastPiles, Starter, startCore } from './core';
import type { EncoderFacts } from './encode-worker';
import { codeOf, KenspeckleError } from './error';
import { type KeptStarter, ownKey, type PastPile, PastStore } from './past-store';

/** What a pile teaches with: its answers, and nothing else of it. */
export interface FinishedPile {
  id: string;
  encoder: EncoderFacts;
  /** Of the answered items, one after the other. */
  embeddings: Float32Array<ArrayBuffer>;
  /** For each of them the number of its tray. */
  labels: Int32Array<ArrayBuffer>;
}

/** How much is done, 0 to 1. */
type Report = (done: number) => void;

/** The share of the work that learning is; before it, piles are gathered and put together. */
const LEARNING = 0.8;

/** The largest file that is looked into: a starter of the most dimensions stays far below. */
const LARGEST_STARTER = 16 << 20;

let store: PastStore | undefined;

function past(): PastStore {
  if (!store) throw new Error('the worker has not been started');
  return store;
}

function learned(from: PastPiles, key: string, encoder: string, piles: readonly string[], report: Report): KeptStarter {
  const starter = from.learn((done) => report(1 - LEARNING + LEARNING * done));
  const { identity, categories, items } = starter;
  // The file stays on the device, whatever it was learned from.
  return { key, identity, encoder, name: undefined, date: Date.now(), categories, items, piles, file: starter.bytes(2) as Uint8Array<ArrayBuffer> };
}

/** Adds what was kept of piles. Order decides the last bits, so it is that of the list. */
async function mergeAll(into: PastPiles, piles: readonly PastPile[]): Promise<void> {
  for (const { id } of piles) {
    const gathered = await past().gathered(id);
    if (gathered) into.merge(gathered);
  }
}

const api = {
  async start(module: WebAssembly.Module, name: string): Promise<void> {
    await startCore(module);
    store = await PastStore.open(name);
  },

  /** Learns from a pile together with all that taught before it. A pile that taught already teaches anew. */
  async teach(pile: FinishedPile, report: Report): Promise<void> {
    const { identity: encoder, dimension, nonNegative } = pile.encoder;
    const own = new PastPiles({ encoder, dimension, nonNegative });
    own.addPile(pile.embeddings, pile.labels, (done) => report((1 - LEARNING) * done));
    const gathered = own.bytes() as Uint8Array<ArrayBuffer>;
    const { categories, items } = own;
    const others = (await past().lists()).piles.filter((one) => one.encoder === encoder && one.id !== pile.id);
    await mergeAll(own, others);
    const piles = [...others.map(({ id }) => id), pile.id];
    const starter = learned(own, ownKey(encoder), encoder, piles, report);
    await past().teach({ id: pile.id, date: Date.now(), encoder, categories, items }, gathered, starter);
  },

  /** Forgets a past pile and learns from the others as if it had never been. */
  async forget(id: string, report: Report): Promise<void> {
    const { piles } = await past().lists();
    const pile = piles.find((one) => one.id === id);
    if (!pile) return;
    const [first, ...rest] = piles.filter((one) => one.encoder === pile.encoder && one.id !== id);
    const key = ownKey(pile.encoder);
    const gathered = first && (await past().gathered(first.id));
    if (!gathered) return past().forget(id, key, undefined);
    const left = PastPiles.read(gathered);
    await mergeAll(left, rest);
    let starter: KeptStarter | undefined;
    try {
      starter = learned(left, key, pile.encoder, [first.id, ...rest.map((one) => one.id)], report);
    } catch (error) {
      if (codeOf(error) !== 'too-little-to-learn') throw error;
    }
    await past().forget(id, key, starter);
  },

  /** Keeps a starter file. `encoders` are those that this page has. Resolves to its key. */
  async take(blob: Blob, name: string, encoders: readonly string[]): Promise<string> {
    if (blob.size > LARGEST_STARTER) throw new KenspeckleError('starter-unreadable', `${name} is far too large for a starter.`);
    const file = new Uint8Array(await blob.arrayBuffer());
    const { identity, encoder, categories, items } = Starter.read(file);
    if (!encoders.includes(encoder)) {
      throw new KenspeckleError('other-encoder', `${name} is for the encoder ${encoder}, and this page has ${encoders.join(' and ')}.`);
    }
    const same = (await past().lists()).starters.find((one) => one.identity === identity);
    const key = same?.key ?? `file ${identity}`;
    if (same) await past().choose(encoder, key);
    else await past().take({ key, identity, encoder, name, date: Date.now(), categories, items, piles: [], file });
    return key;
  },

  /** A starter as a file to give away. Refuses one of so few categories that it could tell what they were. */
  async share(key: string): Promise<Uint8Array<ArrayBuffer>> {
    const kept = await past().starter(key);
    if (!kept) throw new KenspeckleError('starter-gone', 'This starter is not kept here any more.');
    return Starter.read(kept.file).bytes() as Uint8Array<ArrayBuffer>;
  },
};

export type LearnApi = typeof api;

expose(api);
