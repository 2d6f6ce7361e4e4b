import * as Comlink from 'comlink';
import { type Assets, bundledAssets, compileCore } from './core';
import type { FinishedPile, LearnApi } from './learn-worker';
import { NOTHING, ownKey, type PastPile, PastStore, type StarterFacts } from './past-store';

export { NOTHING } from './past-store';
export type { PastPile, StarterFacts } from './past-store';
export type { FinishedPile } from './learn-worker';

export interface PastOptions {
  /** The name of the pile's store: what its piles taught lies beside it. */
  name?: string;
  assets?: Assets;
}

export interface Watched {
  /** Stops at once and leaves everything as it was. */
  signal?: AbortSignal;
  /** Hears how much is done, 0 to 1. */
  onProgress?: (done: number) => void;
}

/**
 * What past piles taught, kept on this device. Everything that takes long runs in a worker of its own, which is there only
 * as long as it has work.
 */
export class PastPiles {
  readonly #name: string;
  readonly #assets: Assets;
  readonly #store: PastStore;
  #piles: readonly PastPile[] = [];
  #starters: readonly StarterFacts[] = [];
  #choices: ReadonlyMap<string, string> = new Map();

  private constructor(name: string, assets: Assets, store: PastStore) {
    this.#name = name;
    this.#assets = assets;
    this.#store = store;
  }

  /** Fails where the browser keeps nothing for the page. */
  static async open({ name = 'kenspeckle', assets = bundledAssets }: PastOptions = {}): Promise<PastPiles> {
    const past = new PastPiles(name, assets, await PastStore.open(name));
    await past.#read();
    return past;
  }

  /** The piles that taught, the oldest first. */
  get piles(): readonly PastPile[] {
    return this.#piles;
  }

  /** What they taught, and the starters that were opened. */
  get starters(): readonly StarterFacts[] {
    return this.#starters;
  }

  /** What the next pile of this encoder's items starts from. */
  forNext(encoder: string): StarterFacts | undefined {
    const key = this.#choices.get(encoder) ?? ownKey(encoder);
    return key === NOTHING ? undefined : this.#starters.find((one) => one.key === key);
  }

  /** Learns from a finished pile together with those before it; the next pile then starts from that. */
  async teach(pile: FinishedPile, { signal, onProgress }: Watched = {}): Promise<void> {
    const report = Comlink.proxy((done: number) => onProgress?.(done));
    await this.#inWorker((worker) => worker.teach(Comlink.transfer(pile, [pile.embeddings.buffer, pile.labels.buffer]), report), signal);
  }

  /** Forgets a past pile: what was gathered from it is deleted, and what was learned with it is learned anew without it. */
  async forget(pile: string, { signal, onProgress }: Watched = {}): Promise<void> {
    const report = Comlink.proxy((done: number) => onProgress?.(done));
    await this.#inWorker((worker) => worker.forget(pile, report), signal);
  }

  /** Forgets all past piles, starters and choices. */
  async forgetAll(): Promise<void> {
    await this.#store.clear();
    await this.#read();
  }

  /**
   * Keeps a starter from a file; the next pile then starts from it. Throws "starter-unreadable", "starter-newer", and
   * "other-encoder" when it is for none of the `encoders`.
   */
  async take(file: Blob, name: string, encoders: readonly string[]): Promise<StarterFacts | undefined> {
    const key = await this.#inWorker((worker) => worker.take(file, name, encoders));
    return this.#starters.find((one) => one.key === key);
  }

  /** A starter as a file to give away. Throws "too-few-to-share". */
  async share(key: string): Promise<Blob> {
    return new Blob([await this.#inWorker((worker) => worker.share(key))], { type: 'application/zip' });
  }

  /** Decides what the next pile starts from: a starter's key, or `NOTHING`. */
  async choose(encoder: string, key: string): Promise<void> {
    await this.#store.choose(encoder, key);
    await this.#read();
  }

  /** Deletes a starter that was opened. A pile that started from it keeps its own copy. */
  async drop(key: string): Promise<void> {
    await this.#store.drop(key);
    await this.#read();
  }

  async #read(): Promise<void> {
    const { piles, starters, choices } = await this.#store.lists();
    this.#piles = piles;
    this.#starters = starters;
    this.#choices = choices;
  }

  async #inWorker<T>(work: (worker: Comlink.Remote<LearnApi>) => Promise<T>, signal?: AbortSignal): Promise<T> {
    signal?.throwIfAborted();
    const worker = new Worker(new URL('./learn-worker.ts', import.meta.url), { type: 'module' });
    try {
      const api = Comlink.wrap<LearnApi>(worker);
      const ended = new Promise<never>((_, reject) => {
        signal?.addEventListener('abort', () => reject(signal.reason as Error));
        worker.addEventListener('error', (event) => reject(new Error(event.message)));
      });
      ended.catch(() => undefined);
      const done = async () => {
        await api.start(await compileCore(this.#assets.wasm), this.#name);
        return work(api);
      };
      return await Promise.race([done(), ended]);
    } finally {
      // In the middle of a computation nothing else stops it; what it keeps, it keeps in one piece at the end.
      worker.terminate();
      await this.#read();
    }
  }
}
