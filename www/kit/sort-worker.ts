import { expose } from './bridge';
import * as Comlink from 'comlink';
import { Sorter, startCore } from './core';
import type { EncoderFacts } from './encode-worker';
import { KenspeckleError } from './error';
import { type Saved, Saver } from './saver';
import { type Addition, Store, type StoredItem, type StoredPictures } from './store';

export interface Tray {
  tray: number;
  name: string;
  /** How many answers name it. */
  answers: number;
}

/** What became of each item, by item number. */
export interface Verdicts {
  /** The tray; −1: not sorted; −2: no longer in the pile. */
  tray: Int32Array<ArrayBuffer>;
  /** 0 … 1; 1 for an answered item. */
  probability: Float32Array<ArrayBuffer>;
  /** The second choice, or −1. */
  runnerUp: Int32Array<ArrayBuffer>;
  runnerUpProbability: Float32Array<ArrayBuffer>;
  /** A value of `Status`. */
  status: Uint8Array<ArrayBuffer>;
}

export const Status = { sorted: 0, answered: 1, none: 2, skipped: 3, removed: 4 } as const;

/** Everything that a change can change. */
export interface Snapshot {
  trays: Tray[];
  verdicts: Verdicts;
  /** The item that the sorter asks about; `undefined`: nothing left to ask. */
  question: number | undefined;
  canUndo: boolean;
  canRedo: boolean;
}

export type Action =
  | { do: 'answer'; item: number; tray: number }
  | { do: 'answer-new'; item: number; name: string }
  | { do: 'none' | 'skip' | 'withdraw' | 'remove-item'; item: number }
  | { do: 'add-tray'; name: string }
  | { do: 'rename-tray'; tray: number; name: string }
  | { do: 'merge-trays'; from: number; into: number }
  | { do: 'remove-tray'; tray: number }
  | { do: 'undo' | 'redo' };

export interface Ranked {
  tray: number;
  probability: number;
}

export interface NewItem extends Omit<StoredItem, 'number'> {
  pictures: StoredPictures;
}

export interface OpenedItem {
  number: number;
  name: string;
  fingerprint: string;
  width: number;
  height: number;
  thumbnail: Blob | undefined;
}

export interface Opened {
  items: OpenedItem[];
  /** Absent when there is no pile yet. */
  snapshot: Snapshot | undefined;
  /** Set when this browser keeps nothing for the page: the pile lasts until the tab is closed. */
  notKept: string | undefined;
}

let sorter: Sorter | undefined;
let facts: EncoderFacts | undefined;
let store: Store | undefined;
let saver: Saver | undefined;

function pile(): Sorter {
  if (!sorter) throw new KenspeckleError('pile-empty', 'There is no pile yet: add photos first.');
  return sorter;
}

function snapshot(): Snapshot {
  const pileNow = pile();
  const verdicts = pileNow.verdicts() as Verdicts;
  const all: Snapshot = {
    trays: pileNow.trays() as Tray[],
    verdicts,
    question: pileNow.nextQuestion(),
    canUndo: pileNow.canUndo,
    canRedo: pileNow.canRedo,
  };
  return Comlink.transfer(
    all,
    [verdicts.tray, verdicts.probability, verdicts.runnerUp, verdicts.runnerUpProbability, verdicts.status].map((a) => a.buffer),
  );
}

function save(additions: Addition[]): void {
  if (facts) saver?.save(additions, { sorter: pile().state(), encoder: facts });
}

function apply(action: Action): string | undefined {
  const to = pile();
  switch (action.do) {
    case 'answer':
      return void to.answer(action.item, action.tray);
    case 'answer-new':
      return void to.answerNew(action.item, action.name);
    case 'none':
      return void to.answerNone(action.item);
    case 'skip':
      return void to.skip(action.item);
    case 'withdraw':
      return void to.withdraw(action.item);
    case 'remove-item':
      return void to.removeItem(action.item);
    case 'add-tray':
      return void to.addTray(action.name);
    case 'rename-tray':
      return void to.renameTray(action.tray, action.name);
    case 'merge-trays':
      return void to.mergeTrays(action.from, action.into);
    case 'remove-tray':
      return void to.removeTray(action.tray);
    case 'undo':
      return to.undo();
    case 'redo':
      return to.redo();
  }
}

/** One tab at a time owns a pile, for as long as its worker lives. */
async function own(name: string): Promise<void> {
  const granted = await new Promise<boolean>((resolve) => {
    // The tab that was reloaded may hold the lock a moment longer than its page lives.
    navigator.locks
      .request(`pile ${name}`, { signal: AbortSignal.timeout(2500) }, () => {
        resolve(true);
        return new Promise<never>(() => {});
      })
      .catch(() => resolve(false));
  });
  if (!granted) {
    throw new KenspeckleError('pile-open-elsewhere', 'This pile is open in another tab. Close that tab, then reload this one.');
  }
}

const api = {
  /** Opens the store `name` and takes up the pile that lies in it. */
  async open(module: WebAssembly.Module, name: string, report: (saved: Saved) => void): Promise<Opened> {
    await Promise.all([startCore(module), own(name)]);
    try {
      store = await Store.open(name);
    } catch (error) {
      return { items: [], snapshot: undefined, notKept: error instanceof Error ? error.message : String(error) };
    }
    saver = new Saver(store, report);
    const { items, thumbnails, state } = await store.load();
    if (state === undefined) return { items: [], snapshot: undefined, notKept: undefined };
    const dimension = items[0]?.embedding.length ?? 0;
    const embeddings = new Float32Array(items.length * dimension);
    items.forEach((item, index) => embeddings.set(item.embedding, index * dimension));
    facts = state.encoder;
    sorter = Sorter.restore(state.sorter, embeddings);
    const opened = items.map(({ embedding: _, ...item }) => ({ ...item, thumbnail: thumbnails.get(item.number) }));
    return { items: opened, snapshot: snapshot(), notKept: undefined };
  },

  /**
   * Adds items in order, and starts the pile with the first. Resolves to the first one's number. The items are stored at
   * once; only with `sort` is the pile sorted anew and the sorter's state stored as well. A state that knows fewer items
   * than the store holds takes up the others as new ones.
   */
  add(items: NewItem[], encoder: EncoderFacts, sort: boolean): { first: number; snapshot: Snapshot | undefined } {
    facts ??= encoder;
    if (facts.identity !== encoder.identity) {
      throw new KenspeckleError(
        'encoder-changed',
        'This pile was read by another version of the encoder, so nothing can be added. Take the result, then start over.',
      );
    }
    const isFirst = sorter === undefined;
    sorter ??= new Sorter({ encoder: facts.identity, dimension: facts.dimension, nonNegative: facts.nonNegative });
    const to = sorter;
    const additions = items.map(({ pictures, ...item }): Addition => {
      return { item: { ...item, number: to.addItem(item.embedding) }, pictures };
    });
    if (sort || isFirst) save(additions);
    else saver?.save(additions, undefined);
    return { first: additions[0]?.item.number ?? 0, snapshot: sort || isFirst ? snapshot() : undefined };
  },

  /** Sorts the pile with all that was added, and stores the sorter's state. */
  sort(): Snapshot {
    save([]);
    return snapshot();
  },

  /** Makes a change. Resolves to what the pile is after it, and for undo and redo to the kind of the change. */
  act(action: Action): { snapshot: Snapshot; kind: string | undefined } {
    const kind = apply(action);
    save([]);
    return { snapshot: snapshot(), kind };
  },

  ranking(item: number): Ranked[] {
    return pile().ranking(item) as Ranked[];
  },

  async original(number: number): Promise<Blob | undefined> {
    await saver?.settled();
    return store?.original(number);
  },

  /** Resolves when everything so far is written, or failed to be. */
  async settled(): Promise<void> {
    await saver?.settled();
  },

  /** Forgets the pile, here and in the store. */
  async clear(): Promise<void> {
    sorter?.free();
    sorter = undefined;
    facts = undefined;
    await saver?.clear();
  },
};

export type SortApi = typeof api;

expose(api);
