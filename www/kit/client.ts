import * as Comlink from 'comlink';
import { deleteDB } from 'idb';
import { type Hindsight, type Kind, kindOf } from './core';
import { KenspeckleError } from './error';
import { type Arrival, Intake, type NoteArrival, type NoteSource, type PhotoArrival, type Progress, type Source } from './intake';
import type { Fetched, NoteInFile } from './notes';
import { Readers } from './readers';
import { hindsightOf } from './hindsight';
import type { FinishedPile, Watched } from './past';
import type { Saved } from './saver';
import type { NoteFile, NoteRow } from './store';
import type { Judgement, SpotCheckPlan, Terms } from './core';
import { type Action, Aside, type Ranked, type Snapshot, type SortApi, Status, type Trust } from './sort-worker';

export { type Kind, kindOf } from './core';
export type { Hindsight, HindsightPoint, Outlook, ShareRange, Strip } from './core';
export { KenspeckleError, codeOf, messageOf } from './error';
export { type Kit, Kits } from './kits';
export type { Fetched, HandBack, NoteInFile, TableHead } from './notes';
export { Readers } from './readers';
export type { NoteFile } from './store';
export { type FinishedPile, NOTHING, type PastPile, PastPiles, type StarterFacts } from './past';
export type { Duplicate, Progress, Refused, Source } from './intake';
export type { Saved } from './saver';
export { Aside, Status };
export type { CheckView } from './checking';
export type { Assessment, Doubt, Judgement, Projection, Share, SpotCheckPlan, Statement, Terms } from './core';
export type { Action, PileStarter, Ranked, Snapshot, Tray, Trust, Verdicts } from './sort-worker';

interface AnyItem {
  number: number;
  name: string;
}

export interface PhotoItem extends AnyItem {
  width: number;
  height: number;
  thumbnail: Blob | undefined;
}

export interface NoteItem extends AnyItem {
  text: string;
  /** 1 unless the note was so long that it was read in parts and averaged. */
  parts: number;
  /** Rows with this text. */
  rows: number;
}

/** An item of the pile, by its number. */
export type Item = PhotoItem | NoteItem;

/** A file that notes of the pile came from, and the item in each of its rows. */
export interface FileOfNotes extends NoteFile {
  /** By row; nothing for one that was not read. */
  items: readonly (number | undefined)[];
}

export interface ClientOptions {
  /** The pile's name in this origin's storage. */
  name?: string;
  /** The name that past piles are kept beside. */
  past?: string;
  /** Shared among the kits of a page. */
  readers?: Readers;
}

/** How often the pile is sorted anew while photos arrive, in milliseconds: sorting it for each would take quadratic time. */
const SORT_EVERY = 250;

interface ClientEvents {
  /** The pile changed: `client.snapshot` and `client.items` are new. */
  change: CustomEvent<Snapshot | undefined>;
  progress: CustomEvent<Progress>;
  saved: CustomEvent<Saved>;
  /** How the text encoder arrives; `undefined` once that is over. */
  fetched: CustomEvent<Fetched | undefined>;
}

/**
 * A pile that is read, sorted and kept by workers. Every change resolves once the pile is sorted anew, and is written
 * to the device's store right after.
 */
export class PileClient extends EventTarget {
  readonly #sort: Comlink.Remote<SortApi>;
  readonly #worker: Worker;
  readonly #readers: Readers;
  readonly #intake: Intake;
  #items: Item[] = [];
  #files: (NoteFile & { items: (number | undefined)[] })[] = [];
  /** By item number. */
  #fingerprints: string[] = [];
  /** Of notes: item numbers by fingerprint. */
  readonly #numbers = new Map<string, number>();
  /** What is being added before there is a snapshot to tell. */
  #adding: Kind | undefined;
  #snapshot: Snapshot | undefined;
  #sortedAt = -Infinity;
  /** Set while items have arrived that the pile was not sorted with. */
  #sortSoon: ReturnType<typeof setTimeout> | undefined;
  #sorting: Promise<void> = Promise.resolve();
  /** Why the browser keeps nothing, if so. */
  #notKept: string | undefined;
  /** Originals of this visit: files on disk, so they cost no memory. */
  readonly #originals = new Map<number, Blob>();

  private constructor(worker: Worker, readers: Readers) {
    super();
    this.#worker = worker;
    this.#sort = Comlink.wrap<SortApi>(worker);
    this.#readers = readers;
    readers.notes.onFetch = (fetched) => this.#emit('fetched', fetched);
    this.#intake = new Intake(
      readers,
      (arrival) => this.#arrive(arrival),
      (arrival) => this.#again(arrival),
      () => this.#sortArrived(),
      (progress) => this.#emit('progress', progress),
    );
  }

  /** Starts the workers and takes up the pile that this device keeps under the name. */
  static async open({ name = 'kenspeckle', past = 'kenspeckle', readers = new Readers() }: ClientOptions = {}): Promise<PileClient> {
    const module = await readers.module;
    const worker = new Worker(new URL('./sort-worker.ts', import.meta.url), { type: 'module' });
    const client = new PileClient(worker, readers);
    try {
      await client.#open(module, name, past);
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

  /** What the items are; `undefined` for a pile without any. */
  get kind(): Kind | undefined {
    return this.#snapshot ? kindOf(this.#snapshot.encoder) : this.#adding;
  }

  /** What notes came from, in order. */
  get files(): readonly FileOfNotes[] {
    return this.#files;
  }

  /** Whether something is being read or waits to be. */
  get busy(): boolean {
    return this.#intake.busy;
  }

  get notKept(): string | undefined {
    return this.#notKept;
  }

  /** Loads the photo encoder ahead of the first photo. */
  async warm(): Promise<void> {
    await this.#readers.warm();
  }

  /**
   * Adds photos to the pile. Resolves when all are read, or reading was stopped; `progress` events tell the rest. Throws
   * "other-kind" for a pile of notes.
   */
  async add(sources: Iterable<Source>, signal?: AbortSignal): Promise<void> {
    this.#claim('photos');
    await this.#intake.add(sources, signal);
  }

  /**
   * Adds the notes in a file's column, which keeps the file. Rows that were read before are not read again. Resolves like
   * `add`, to how many notes were not in the pile before. Throws "other-kind" for a pile of photos.
   */
  async addNotes(file: NoteFile, notes: readonly NoteInFile[], name: (note: NoteInFile) => string): Promise<number> {
    this.#claim('notes');
    let number = this.#files.findIndex(({ fingerprint, column }) => fingerprint === file.fingerprint && column === file.column);
    if (number < 0) {
      number = this.#files.length;
      this.#files.push({ ...file, items: [] });
      await this.#sort.keepFile(number, file);
    }
    const { items } = this.#files[number] ?? { items: [] };
    const status = this.#snapshot?.verdicts.status;
    // What was taken out of the pile may come in again.
    const there = (row: number) => items[row] !== undefined && status?.[items[row]] !== Status.removed;
    const sources = notes
      .filter(({ row }) => !there(row))
      .map((note): NoteSource => ({ name: name(note), text: note.text, file: number, row: note.row }));
    await this.#intake.add(sources);
    return sources.length;
  }

  #claim(kind: Kind): void {
    if ((this.kind ?? kind) !== kind) throw new KenspeckleError('other-kind', 'This pile holds another kind of items. Start another kit for these.');
    this.#adding = kind;
  }

  /** Stops reading; what is left can be read later with `goOn`. */
  stop(): void {
    this.#intake.stop();
    this.#readers.notes.stopFetching();
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

  /**
   * How many answers in random order would have brought as much as the person's. Works in a worker of its own. Throws
   * "too-little-to-tell".
   */
  async hindsight(watched: Watched = {}): Promise<Hindsight> {
    return hindsightOf(await this.#sort.copy(), await this.#readers.module, watched);
  }

  /** The identities of the encoders this page has: what starters must be for. Loads that for photos. */
  async encoders(): Promise<string[]> {
    return this.#readers.identities();
  }

  /** The files that the notes came from as one table, with the columns `names` for what `found` says of an item (`null`: leave it out). */
  async handBack(names: readonly string[], found: (item: number) => readonly string[] | null): Promise<Blob> {
    const files = this.#files.map(({ name, file, items }) => {
      return { name, file, found: Array.from(items, (item) => (item === undefined ? undefined : found(item))) };
    });
    return this.#readers.notes.handBack(files, names);
  }

  /** The row that a note stands in, the first of several: its columns with their cells. */
  async rowOf(item: number): Promise<[column: string, cell: string][]> {
    for (const { name, file, items } of this.#files) {
      const row = items.indexOf(item);
      if (row >= 0) return this.#readers.notes.rowOf(file, name, row);
    }
    return [];
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
    this.#files = [];
    this.#fingerprints = [];
    this.#numbers.clear();
    this.#adding = undefined;
    this.#changed(undefined);
  }

  /** Lets go of the pile once all is written; what was not read yet is not. */
  async close(): Promise<void> {
    await this.#intake.cancel();
    await this.settled();
    this.#worker.terminate();
  }

  on<K extends keyof ClientEvents>(type: K, listener: (event: ClientEvents[K]) => void): void {
    this.addEventListener(type, listener as EventListener);
  }

  async #open(module: WebAssembly.Module, name: string, past: string): Promise<void> {
    const report = Comlink.proxy((saved: Saved) => this.#emit('saved', saved));
    const { items, files, rows, snapshot, notKept } = await this.#sort.open(module, name, past, report);
    this.#notKept = notKept;
    this.#files = files.map((file) => ({ ...file, items: [] }));
    this.#items = items.map((item): Item => ('text' in item ? { ...item, rows: 0 } : item));
    this.#fingerprints = items.map(({ fingerprint }) => fingerprint);
    for (const row of rows) this.#standsFor(row);
    this.#snapshot = snapshot;
    if (snapshot) this.#know(snapshot);
  }

  #standsFor({ file, row, item }: NoteRow): void {
    const of = this.#files[file];
    const note = this.#items[item];
    if (of) of.items[row] = item;
    if (note && 'text' in note) note.rows++;
  }

  async #arrive(arrival: Arrival): Promise<void> {
    const due = performance.now() - this.#sortedAt >= SORT_EVERY;
    const snapshot = 'blob' in arrival ? await this.#addPhoto(arrival, due) : await this.#addNote(arrival, due);
    if (snapshot) {
      this.#sorted();
      this.#changed(snapshot);
    } else {
      // The next item may take its time.
      this.#sortSoon ??= setTimeout(() => void this.#sortArrived().catch(() => undefined), SORT_EVERY);
    }
  }

  async #addPhoto(arrival: PhotoArrival, due: boolean): Promise<Snapshot | undefined> {
    const { source, blob, read } = arrival;
    const { name } = source;
    const { embedding, width, height, fingerprint } = read;
    const thumbnail = new Blob([read.thumbnail], { type: 'image/jpeg' });
    const item = { name, fingerprint, width, height, embedding, pictures: { thumbnail, original: blob } };
    const { first, snapshot } = await this.#sort.add([item], this.#readers.facts(arrival), due);
    this.#items.push({ number: first, name, width, height, thumbnail });
    this.#fingerprints.push(fingerprint);
    this.#originals.set(first, blob);
    return snapshot;
  }

  async #addNote(arrival: NoteArrival, due: boolean): Promise<Snapshot | undefined> {
    const { name, text, file, row } = arrival.source;
    const { embedding, parts, fingerprint } = arrival.read;
    const item = { name, fingerprint, text, parts, embedding, at: { file, row } };
    const { first, snapshot } = await this.#sort.add([item], this.#readers.facts(arrival), due);
    this.#items.push({ number: first, name, text, parts, rows: 0 });
    this.#fingerprints.push(fingerprint);
    this.#numbers.set(fingerprint, first);
    this.#standsFor({ file, row, item: first });
    return snapshot;
  }

  /** A note with the text of another is the same item: one answer is for both, and both rows are handed back. */
  async #again(arrival: Arrival): Promise<void> {
    if ('blob' in arrival) return;
    const item = this.#numbers.get(arrival.read.fingerprint);
    if (item === undefined) return;
    const { file, row } = arrival.source;
    this.#standsFor({ file, row, item });
    await this.#sort.keepRow({ file, row, item });
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
      if (fingerprint === undefined || verdicts.status[number] === Status.removed) continue;
      this.#intake.know(fingerprint, name);
      this.#numbers.set(fingerprint, number);
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
