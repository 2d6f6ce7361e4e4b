import * as Comlink from 'comlink';
import { deleteDB } from 'idb';
import { type Assets, bundledAssets, compileCore, fetchBytes } from './core';
import type { ReadPhoto } from './encode-worker';
import { type Arrival, Intake, type Progress, type Source } from './intake';
import { EncodePool } from './pool';
import type { FinishedPile } from './past';
import type { Saved } from './saver';
import type { Judgement, SpotCheckPlan, Terms } from './core';
import { type Action, Aside, type Ranked, type Snapshot, type SortApi, Status, type Trust } from './sort-worker';

export { KenspeckleError, codeOf, messageOf } from './error';
export { type FinishedPile, NOTHING, type PastPile, PastPiles, type StarterFacts } from './past';
export type { Duplicate, Progress, Refused, Source } from './intake';
export type { Saved } from './saver';
export { Aside, Status };
export type { CheckView } from './checking';
export type { Assessment, Doubt, Judgement, Projection, Share, SpotCheckPlan, Statement, Terms } from './core';
export type { Action, PileStarter, Ranked, Snapshot, Tray, Trust, Verdicts } from './sort-worker';

/** An item of the pile, by its number. */
export interface Item {
  number: number;
  name: string;
  width: number;
  height: number;
  thumbnail: Blob | undefined;
}

export interface ClientOptions {
  /** The pile's name in this origin's storage. */
  name?: string;
  assets?: Assets;
  /** Longest side of the small pictures, in pixels. */
  thumbnailSide?: number;
}

/** How often the pile is sorted anew while photos arrive, in milliseconds: sorting it for each would take quadratic time. */
const SORT_EVERY = 250;

interface ClientEvents {
  /** The pile changed: `client.snapshot` and `client.items` are new. */
  change: CustomEvent<Snapshot | undefined>;
  progress: CustomEvent<Progress>;
  saved: CustomEvent<Saved>;
}

/**
 * A pile that is read, sorted and kept by workers. Every change resolves once the pile is sorted anew, and is written
 * to the device's store right after.
 */
export class PileClient extends EventTarget {
  readonly #sort: Comlink.Remote<SortApi>;
  readonly #worker: Worker;
  readonly #pool: EncodePool;
  readonly #intake: Intake;
  #items: Item[] = [];
  /** By item number. */
  #fingerprints: string[] = [];
  #snapshot: Snapshot | undefined;
  #sortedAt = -Infinity;
  /** Set while items have arrived that the pile was not sorted with. */
  #sortSoon: ReturnType<typeof setTimeout> | undefined;
  #sorting: Promise<void> = Promise.resolve();
  /** Why the browser keeps nothing, if so. */
  #notKept: string | undefined;
  /** Originals of this visit: files on disk, so they cost no memory. */
  readonly #originals = new Map<number, Blob>();

  private constructor(worker: Worker, pool: EncodePool, thumbnailSide: number) {
    super();
    this.#worker = worker;
    this.#sort = Comlink.wrap<SortApi>(worker);
    this.#pool = pool;
    this.#intake = new Intake(
      pool,
      thumbnailSide,
      (arrival) => this.#arrive(arrival),
      () => this.#sortArrived(),
      (progress) => this.#emit('progress', progress),
    );
  }

  /** Starts the workers and takes up the pile that this device keeps under the name. */
  static async open(options: ClientOptions = {}): Promise<PileClient> {
    const assets = options.assets ?? bundledAssets;
    const module = compileCore(assets.wasm);
    let encoder: Promise<Uint8Array> | undefined;
    const pool = new EncodePool(async () => {
      encoder ??= fetchBytes(assets.photoEncoder);
      try {
        return { module: await module, encoder: await encoder };
      } catch (error) {
        encoder = undefined;
        throw error;
      }
    });
    const worker = new Worker(new URL('./sort-worker.ts', import.meta.url), { type: 'module' });
    const client = new PileClient(worker, pool, options.thumbnailSide ?? 384);
    try {
      await client.#open(await module, options.name ?? 'kenspeckle');
    } catch (error) {
      worker.terminate();
      throw error;
    }
    return client;
  }

  /** Deletes a pile that can't be opened. */
  static async discard(name = 'kenspeckle'): Promise<void> {
    await deleteDB(name);
  }

  get items(): readonly Item[] {
    return this.#items;
  }

  get snapshot(): Snapshot | undefined {
    return this.#snapshot;
  }

  get notKept(): string | undefined {
    return this.#notKept;
  }

  /** Loads the encoder ahead of the first photo. */
  async warm(): Promise<void> {
    await this.#pool.warm();
  }

  /** Adds photos to the pile. Resolves when all are read, or reading was stopped; `progress` events tell the rest. */
  async add(sources: Iterable<Source>, signal?: AbortSignal): Promise<void> {
    await this.#intake.add(sources, signal);
  }

  /** Stops reading; what is left can be read later with `goOn`. */
  stop(): void {
    this.#intake.stop();
  }

  async goOn(): Promise<void> {
    await this.#intake.resume();
  }

  /** Changes the pile. Resolves to the kind of change that was undone or redone, if it was one. */
  async act(action: Action): Promise<string | undefined> {
    const { snapshot, kind } = await this.#sort.act(action);
    this.#changed(snapshot);
    return kind;
  }

  /**
   * Starts the pile from another starter (its key among past piles), from its own once more (`true`) or from nothing (`false`).
   * Throws "starter-gone", "starter-of-this-pile", "other-encoder" and "starter-unreadable".
   */
  async changeStarter(to: string | boolean): Promise<void> {
    this.#changed(await this.#sort.changeStarter(to));
  }

  /** The pile as `PastPiles.teach` takes it: the person's answers, not the sorter's guesses. */
  async finished(): Promise<FinishedPile> {
    return this.#sort.finished();
  }

  /** The identities of the encoders this page has: what starters must be for. Loads the encoder. */
  async encoders(): Promise<string[]> {
    await this.#pool.warm();
    return [this.#pool.facts.identity];
  }

  /** Asks for another confidence or another share to set aside. */
  async setTerms(terms: Terms): Promise<void> {
    this.#changed(await this.#sort.setTerms(terms));
  }

  /** How far the sorting can be relied on, and about how many more answers reach the accuracy `target` (above 0, below 1). */
  async trust(target: number): Promise<Trust> {
    return this.#sort.trust(target);
  }

  /** How many items a spot check would be about, and how many of them it would look at. Throws "nothing-to-check". */
  async spotCheckSize(plan: SpotCheckPlan): Promise<{ items: number; size: number }> {
    return this.#sort.spotCheckSize(plan);
  }

  /** Draws a spot check from the pile as it is sorted now; `snapshot.check` is it from then on. */
  async startCheck(plan: SpotCheckPlan, seed: number): Promise<void> {
    this.#changed(await this.#sort.startCheck(plan, seed));
  }

  /** What the person says of an item of the spot check; `null` takes it back. */
  async judge(item: number, judgement: Judgement | null): Promise<void> {
    const check = await this.#sort.judge(item, judgement);
    if (this.#snapshot) this.#changed({ ...this.#snapshot, check });
  }

  /** Ends the spot check with its statement; what was looked at becomes answers. */
  async stateCheck(date: string): Promise<void> {
    this.#changed(await this.#sort.stateCheck(date));
  }

  /** Ends the spot check without a statement, or forgets one that was made; what was looked at stays answered. */
  async dropCheck(): Promise<void> {
    this.#changed(await this.#sort.dropCheck());
  }

  /** All trays for an item, most probable first. */
  async ranking(item: number): Promise<Ranked[]> {
    return this.#sort.ranking(item);
  }

  /** The photo as it came, where the device still has it. */
  async original(item: number): Promise<Blob | undefined> {
    return this.#originals.get(item) ?? (await this.#sort.original(item));
  }

  /** Resolves when all changes so far are written, or writing failed. */
  async settled(): Promise<void> {
    await this.#sort.settled();
  }

  /** Forgets the pile, here and on the device. */
  async clear(): Promise<void> {
    await this.#intake.cancel();
    await this.#sort.clear();
    this.#intake.forget();
    this.#originals.clear();
    this.#items = [];
    this.#fingerprints = [];
    this.#changed(undefined);
  }

  close(): void {
    this.#worker.terminate();
  }

  on<K extends keyof ClientEvents>(type: K, listener: (event: ClientEvents[K]) => void): void {
    this.addEventListener(type, listener as EventListener);
  }

  async #open(module: WebAssembly.Module, name: string): Promise<void> {
    const report = Comlink.proxy((saved: Saved) => this.#emit('saved', saved));
    const { items, snapshot, notKept } = await this.#sort.open(module, name, report);
    this.#notKept = notKept;
    this.#items = items;
    this.#fingerprints = items.map(({ fingerprint }) => fingerprint);
    this.#snapshot = snapshot;
    if (snapshot) this.#know(snapshot);
  }

  async #arrive({ source, blob, read }: Arrival): Promise<void> {
    const { name } = source;
    const { embedding, width, height, fingerprint } = read satisfies ReadPhoto;
    const thumbnail = new Blob([read.thumbnail], { type: 'image/jpeg' });
    const item = { name, fingerprint, width, height, embedding, pictures: { thumbnail, original: blob } };
    const due = performance.now() - this.#sortedAt >= SORT_EVERY;
    const { first, snapshot } = await this.#sort.add([item], this.#pool.facts, due);
    this.#items.push({ number: first, name, width, height, thumbnail });
    this.#fingerprints.push(fingerprint);
    this.#originals.set(first, blob);
    if (snapshot) {
      this.#sorted();
      this.#changed(snapshot);
    } else {
      // The next photo may take its time.
      this.#sortSoon ??= setTimeout(() => void this.#sortArrived().catch(() => undefined), SORT_EVERY);
    }
  }

  #sorted(): void {
    clearTimeout(this.#sortSoon);
    this.#sortSoon = undefined;
    this.#sortedAt = performance.now();
  }

  async #sortArrived(): Promise<void> {
    if (this.#sortSoon === undefined) return this.#sorting;
    this.#sorted();
    this.#sorting = this.#sort.sort().then((snapshot) => this.#changed(snapshot));
    await this.#sorting;
  }

  /** What was taken out of the pile may come in again. */
  #know({ verdicts }: Snapshot): void {
    this.#intake.forget();
    for (const { number, name } of this.#items) {
      const fingerprint = this.#fingerprints[number];
      if (fingerprint !== undefined && verdicts.status[number] !== Status.removed) this.#intake.know(fingerprint, name);
    }
  }

  #changed(snapshot: Snapshot | undefined): void {
    const before = this.#snapshot?.verdicts.status;
    this.#snapshot = snapshot;
    const differs = (status: number, item: number) => (status === Status.removed) !== (before?.[item] === Status.removed);
    if (snapshot?.verdicts.status.some(differs)) this.#know(snapshot);
    this.#emit('change', snapshot);
  }

  #emit<K extends keyof ClientEvents>(type: K, detail: ClientEvents[K]['detail']): void {
    this.dispatchEvent(new CustomEvent(type, { detail }));
  }
}
