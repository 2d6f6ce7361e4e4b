import { expose } from './bridge';
import * as Comlink from 'comlink';
import { Checking, type CheckView } from './checking';
import {
  type Assessment,
  type Doubt,
  type Judgement,
  type Outlook,
  type PlausibleSets,
  type Projection,
  Sorter,
  type SpotCheckPlan,
  Starter,
  startCore,
  type Strip,
  type Terms,
} from './core';
import type { EncoderFacts } from './encode-worker';
import { KenspeckleError } from './error';
import type { FinishedPile } from './learn-worker';
import { type KeptStarter, PastStore } from './past-store';
import { type Saved, Saver } from './saver';
import { lockOf } from './kits';
import { type Addition, type NoteFacts, type NoteFile, type NoteRow, type PhotoFacts, Store, type StoredPictures } from './store';

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
  /** A value of `Aside`: why the sorter sets it aside, if it does; such an item is in no tray. */
  setAside: Uint8Array<ArrayBuffer>;
}

export const Status = { sorted: 0, answered: 1, none: 2, skipped: 3, removed: 4 } as const;

export const Aside = { not: 0, unlike: 1, between: 2, tooLittle: 3 } as const;

/** How far the sorting can be relied on. */
export interface Trust {
  /** Absent while fewer than two trays have an answer. */
  assessment: Assessment | undefined;
  /** About how many more answers reach the target. */
  projection: Projection | undefined;
  /** The gravest first. */
  doubts: Doubt[];
}

/** What past piles taught this pile. */
export interface PileStarter {
  /** Whether the pile starts from it. */
  on: boolean;
  identity: string;
  categories: number;
  /** The file it came from; absent for what this device's piles taught. */
  name: string | undefined;
}

/** Everything that a change can change. */
export interface Snapshot {
  /** Names the pile among past piles. */
  id: string;
  /** Whose embeddings it sorts. */
  encoder: string;
  trays: Tray[];
  verdicts: Verdicts;
  /** The item that the sorter asks about; `undefined`: nothing left to ask. */
  question: number | undefined;
  /** Look-alikes that could all be confirmed at one go instead. */
  strip: Strip | undefined;
  /** How much of what has no answer is sorted right; `undefined`: too little to tell, or nothing left. */
  outlook: Outlook | undefined;
  canUndo: boolean;
  canRedo: boolean;
  starter: PileStarter | undefined;
  terms: Terms;
  plausible: PlausibleSets;
  check: CheckView | undefined;
}

export type Action =
  | { do: 'answer' | 'settle-doubt'; item: number; tray: number }
  | { do: 'answer-new'; item: number; name: string }
  | { do: 'answer-all'; items: readonly number[]; tray: number }
  | { do: 'answer-all-new'; items: readonly number[]; name: string }
  | { do: 'none' | 'skip' | 'withdraw' | 'remove-item'; item: number }
  | { do: 'add-tray'; name: string }
  | { do: 'rename-tray'; tray: number; name: string }
  | { do: 'merge-trays'; from: number; into: number }
  | { do: 'remove-tray'; tray: number }
  | { do: 'undo' | 'redo' };

/** The pile without pictures, for another worker. */
export interface PileCopy {
  state: string;
  embeddings: Float32Array<ArrayBuffer>;
  /** The starter's file, if the pile starts from it. */
  starter: Uint8Array<ArrayBuffer> | undefined;
}

export interface Ranked {
  tray: number;
  probability: number;
}

/** An item to be added. A note says in which row of which file it stands. */
export type NewItem = {
  name: string;
  fingerprint: string;
  embedding: Float32Array<ArrayBuffer>;
} & ((PhotoFacts & { pictures: StoredPictures }) | (NoteFacts & { at: Omit<NoteRow, 'item'> }));

export type OpenedItem = {
  number: number;
  name: string;
  fingerprint: string;
} & ((PhotoFacts & { thumbnail: Blob | undefined }) | NoteFacts);

export interface Opened {
  items: OpenedItem[];
  /** What notes came from, by file number. */
  files: NoteFile[];
  rows: NoteRow[];
  /** Absent when there is no pile yet. */
  snapshot: Snapshot | undefined;
  /** Set when this browser keeps nothing for the page: the pile lasts until the tab is closed. */
  notKept: string | undefined;
}

let sorter: Sorter | undefined;
let facts: EncoderFacts | undefined;
let id = '';
let starter: KeptStarter | undefined;
let store: Store | undefined;
let past: PastStore | undefined;
let saver: Saver | undefined;
/** Embeddings of all items, only where the browser keeps nothing. */
let unkept: Float32Array<ArrayBuffer>[] = [];
const checking = new Checking();
/** Items wait while the starter changes. */
let changing: Promise<unknown> = Promise.resolve();

function pile(): Sorter {
  if (!sorter) throw new KenspeckleError('pile-empty', 'There is no pile yet: add something first.');
  return sorter;
}

function snapshot(): Snapshot {
  const pileNow = pile();
  const verdicts = pileNow.verdicts() as Verdicts;
  const all: Snapshot = {
    id,
    encoder: facts?.identity ?? '',
    trays: pileNow.trays() as Tray[],
    verdicts,
    question: pileNow.nextQuestion(),
    strip: pileNow.bestStrip(),
    outlook: pileNow.outlook(),
    canUndo: pileNow.canUndo,
    canRedo: pileNow.canRedo,
    starter: starter && {
      on: pileNow.starter !== undefined,
      identity: starter.identity,
      categories: starter.categories,
      name: starter.name,
    },
    terms: pileNow.terms,
    plausible: pileNow.plausibleSets(),
    check: checking.view(pileNow),
  };
  return Comlink.transfer(
    all,
    [verdicts.tray, verdicts.probability, verdicts.runnerUp, verdicts.runnerUpProbability, verdicts.status, verdicts.setAside].map((a) => a.buffer),
  );
}

function save(additions: Addition[]): void {
  const now = pile();
  if (facts) saver?.save(additions, { sorter: now.state(), encoder: facts, id, starts: now.starter !== undefined, starter, check: checking.stored });
}

/** Calls with the starter of a file, which is freed afterwards: the sorter keeps a share of its own. */
function withStarter<T>(kept: KeptStarter | undefined, call: (starter: Starter | undefined) => T): T {
  const read = kept && Starter.read(kept.file);
  try {
    return call(read);
  } finally {
    read?.free();
  }
}

/** The embeddings of all items, by item number. */
async function embeddings(): Promise<Float32Array<ArrayBuffer>[]> {
  if (!store) return unkept;
  await saver?.settled();
  const all: Float32Array<ArrayBuffer>[] = [];
  for (const { number, embedding } of await store.items()) all[number] = embedding;
  for (const { item } of saver?.unwritten ?? []) if (item) all[item.number] = item.embedding;
  return all;
}

function joined(rows: readonly Float32Array[]): Float32Array<ArrayBuffer> {
  const dimension = rows[0]?.length ?? 0;
  const all = new Float32Array(rows.length * dimension);
  rows.forEach((row, index) => all.set(row, index * dimension));
  return all;
}

function newId(): string {
  return crypto.getRandomValues(new Uint32Array(4)).join('-');
}

/** A new pile starts from what the person chose; where that can't be used, from nothing. */
async function begin(encoder: EncoderFacts): Promise<void> {
  facts = encoder;
  id = newId();
  const options = { encoder: encoder.identity, dimension: encoder.dimension, nonNegative: encoder.nonNegative };
  starter = await past?.forNext(encoder.identity).catch(() => undefined);
  try {
    sorter = withStarter(starter, (given) => new Sorter(given ? { ...options, starter: given } : options));
  } catch {
    starter = undefined;
    sorter = new Sorter(options);
  }
}

function apply(action: Action): string | undefined {
  const to = pile();
  switch (action.do) {
    case 'answer':
      return void to.answer(action.item, action.tray);
    case 'settle-doubt':
      return void to.settleDoubt(action.item, action.tray);
    case 'answer-new':
      return void to.answerNew(action.item, action.name);
    case 'answer-all':
      return void to.answerAll(Uint32Array.from(action.items), action.tray);
    case 'answer-all-new':
      return void to.answerAllNew(Uint32Array.from(action.items), action.name);
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
      .request(lockOf(name), { signal: AbortSignal.timeout(2500) }, () => {
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
  /** Opens the store `name` and takes up the pile that lies in it. `pastName`: of the store that past piles lie beside. */
  async open(module: WebAssembly.Module, name: string, pastName: string, report: (saved: Saved) => void): Promise<Opened> {
    await Promise.all([startCore(module), own(name)]);
    try {
      store = await Store.open(name);
      past = await PastStore.open(pastName);
    } catch (error) {
      return { items: [], files: [], rows: [], snapshot: undefined, notKept: error instanceof Error ? error.message : String(error) };
    }
    saver = new Saver(store, report);
    const { items, thumbnails, files, rows, state } = await store.load();
    if (state === undefined) return { items: [], files: [], rows: [], snapshot: undefined, notKept: undefined };
    const all = joined(items.map(({ embedding }) => embedding));
    ({ encoder: facts, id = newId(), starter } = state);
    sorter = withStarter(state.starts ? starter : undefined, (given) => Sorter.restore(state.sorter, all, given));
    checking.open(state.check);
    const opened = items.map(({ embedding: _, ...item }): OpenedItem => {
      return 'text' in item ? item : { ...item, thumbnail: thumbnails.get(item.number) };
    });
    return { items: opened, files, rows, snapshot: snapshot(), notKept: undefined };
  },

  /**
   * Adds items in order, and starts the pile with the first. Resolves to the first one's number. The items are stored at
   * once; only with `sort` is the pile sorted anew and the sorter's state stored as well. A state that knows fewer items
   * than the store holds takes up the others as new ones.
   */
  async add(items: NewItem[], encoder: EncoderFacts, sort: boolean): Promise<{ first: number; snapshot: Snapshot | undefined }> {
    const isFirst = sorter === undefined;
    changing = changing.then(() => (sorter ? undefined : begin(encoder)));
    await changing;
    const to = pile();
    if (facts?.identity !== encoder.identity) {
      throw new KenspeckleError(
        'encoder-changed',
        'This pile was read by another version of the encoder, so nothing can be added. Take the result, then start another kit.',
      );
    }
    const numbers = items.map(({ embedding }) => to.addItem(embedding));
    const additions = items.map((item, index): Addition => {
      const number = numbers[index] ?? 0;
      if ('pictures' in item) {
        const { pictures, ...facts } = item;
        return { item: { ...facts, number }, pictures };
      }
      const { at, ...facts } = item;
      return { item: { ...facts, number }, row: { ...at, item: number } };
    });
    if (!store) unkept.push(...items.map(({ embedding }) => embedding));
    if (sort || isFirst) save(additions);
    else saver?.save(additions, undefined);
    return { first: numbers[0] ?? 0, snapshot: sort || isFirst ? snapshot() : undefined };
  },

  /** Keeps a file that notes come from. */
  keepFile(number: number, file: NoteFile): void {
    saver?.save([{ file: { number, file } }], undefined);
  },

  /** Keeps that an item stands for one more row. */
  keepRow(row: NoteRow): void {
    saver?.save([{ row }], undefined);
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

  /**
   * Starts the pile from a starter of past piles by its key; from its own copy with `true`; from nothing with `false`. Items,
   * trays and answers stay.
   */
  async changeStarter(to: string | boolean): Promise<Snapshot> {
    const work = changing.then(async () => {
      const other = typeof to === 'string' ? await past?.starter(to) : to ? starter : undefined;
      if (to !== false && !other) throw new KenspeckleError('starter-gone', 'This starter is not kept here any more.');
      if (typeof to === 'string' && other?.piles.includes(id)) {
        throw new KenspeckleError('starter-of-this-pile', 'This pile itself taught that, so it can’t tell this pile anything new. It is for the next one.');
      }
      const all = joined(await embeddings());
      withStarter(other, (given) => pile().changeStarter(all, given));
      starter = other ?? starter;
      save([]);
    });
    changing = work.catch(() => undefined);
    await work;
    return snapshot();
  },

  /** The pile as it teaches: the person's answers alone. */
  async finished(): Promise<FinishedPile> {
    const now = pile();
    save([]);
    const all = await embeddings();
    const { tray, status } = now.verdicts() as Verdicts;
    const answered = [...all.keys()].filter((item) => status[item] === Status.answered);
    if (!facts) throw new KenspeckleError('pile-empty', 'There is no pile yet: add something first.');
    const finished = {
      id,
      encoder: facts,
      embeddings: joined(answered.map((item) => all[item] ?? new Float32Array(0))),
      labels: Int32Array.from(answered, (item) => tray[item] ?? -1),
    };
    return Comlink.transfer(finished, [finished.embeddings.buffer, finished.labels.buffer]);
  },

  /** What the person asks of the sorter's care. */
  setTerms(terms: Terms): Snapshot {
    pile().setTerms(terms);
    save([]);
    return snapshot();
  },

  /** How far the sorting can be relied on, and about how many more answers reach the accuracy `target`. */
  trust(target: number): Trust {
    const now = pile();
    return { assessment: now.assessment(), projection: now.moreAnswers(target), doubts: now.doubts() };
  },

  /** How many items a spot check would be about, and how many of them it would look at. Throws "nothing-to-check". */
  spotCheckSize(plan: SpotCheckPlan): { items: number; size: number } {
    const trial = pile().spotCheck(plan, 0);
    try {
      return { items: trial.items, size: trial.left };
    } finally {
      trial.free();
    }
  },

  /** Draws a spot check from the pile as it is sorted now; another one that was there is gone. */
  startCheck(plan: SpotCheckPlan, seed: number): Snapshot {
    checking.start(pile(), plan, seed);
    save([]);
    return snapshot();
  },

  /** What the person says of an item of the spot check; `null` takes it back. */
  judge(item: number, judgement: Judgement | null): CheckView | undefined {
    checking.judge(item, judgement);
    save([]);
    return checking.view(pile());
  },

  /** Ends the spot check with its statement: what was looked at becomes answers. */
  stateCheck(date: string): Snapshot {
    checking.state(pile(), date);
    save([]);
    return snapshot();
  },

  /** Ends the spot check without a statement, or forgets one that was made: what was looked at stays answered. */
  dropCheck(): Snapshot {
    checking.giveUp(pile());
    save([]);
    return snapshot();
  },

  /** A copy of the pile as it is now. */
  async copy(): Promise<PileCopy> {
    const now = pile();
    const state = now.state();
    const file = now.starter === undefined ? undefined : starter?.file;
    const known = (now.verdicts() as Verdicts).status.length;
    const embedded = joined((await embeddings()).slice(0, known));
    return Comlink.transfer({ state, embeddings: embedded, starter: file }, [embedded.buffer]);
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
    await changing;
    sorter?.free();
    sorter = undefined;
    facts = undefined;
    id = '';
    starter = undefined;
    checking.clear();
    unkept = [];
    await saver?.clear();
  },
};

export type SortApi = typeof api;

expose(api);
