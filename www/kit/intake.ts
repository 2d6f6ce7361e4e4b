import type { ReadPhoto } from './encode-worker';
import { codeOf, messageOf } from './error';
import type { ReadNote } from './note-worker';

/** One file to be read. `name` may be a path. */
export interface Source {
  name: string;
  blob: Blob | (() => Promise<Blob>);
}

/** One note to be read: a row of a file that the pile keeps. `name` says where that is. */
export interface NoteSource {
  name: string;
  text: string;
  file: number;
  row: number;
}

export type Unread = Source | NoteSource;

export interface Refused {
  name: string;
  code: string;
  message: string;
}

export interface Duplicate {
  name: string;
  /** The item with the same content that is already in the pile. */
  of: string;
}

export interface Progress {
  done: number;
  total: number;
  /** Of wall-clock time; absent until there is something to go by. */
  secondsLeft: number | undefined;
  state: 'reading' | 'stopped' | 'finished';
  added: number;
  refused: readonly Refused[];
  duplicates: readonly Duplicate[];
}

export interface PhotoArrival {
  source: Source;
  blob: Blob;
  read: ReadPhoto;
}

export interface NoteArrival {
  source: NoteSource;
  read: ReadNote;
}

export type Arrival = PhotoArrival | NoteArrival;

interface Outcome {
  source: Unread;
  arrival?: Arrival;
  refused?: Refused;
  /** Not this item's fault: nothing can be read. */
  fatal?: unknown;
}

/** Who reads the items. */
export interface Eyes {
  /** How many are read at the same time. */
  readonly size: number;
  read(source: Unread): Promise<Arrival>;
}

/** How often progress is told while it goes on, in milliseconds: a page that showed every note would do little else. */
const REPORT_EVERY = 100;

/**
 * Reads items and hands them on in the order they came, whichever worker is faster: the same files give the same item
 * numbers. At most two photos a worker are in memory at once.
 */
export class Intake {
  readonly #eyes: Eyes;
  readonly #deliver: (arrival: Arrival) => Promise<void>;
  /** Called with what the pile holds already. */
  readonly #again: (arrival: Arrival) => Promise<void>;
  /** Called when nothing is left to read for now, before that is reported. */
  readonly #pause: () => Promise<void>;
  readonly #onProgress: (progress: Progress) => void;
  /** Names by fingerprint of all that the pile holds. */
  readonly #known = new Map<string, string>();
  #queue: Unread[] = [];
  #running: Promise<void> | undefined;
  #inHand = 0;
  #stopped = false;
  #done = 0;
  #added = 0;
  #refused: Refused[] = [];
  #duplicates: Duplicate[] = [];
  /** Since when and from where the speed is measured: the first item may have waited for its encoder. */
  #startedAt: number | undefined;
  #doneAtStart = 0;
  #reportedAt = -Infinity;

  constructor(
    eyes: Eyes,
    deliver: (arrival: Arrival) => Promise<void>,
    again: (arrival: Arrival) => Promise<void>,
    pause: () => Promise<void>,
    onProgress: (progress: Progress) => void,
  ) {
    this.#eyes = eyes;
    this.#deliver = deliver;
    this.#again = again;
    this.#pause = pause;
    this.#onProgress = onProgress;
  }

  know(fingerprint: string, name: string): void {
    this.#known.set(fingerprint, name);
  }

  forget(): void {
    this.#known.clear();
  }

  /** Whether anything is read or waits to be. */
  get busy(): boolean {
    return this.#running !== undefined || this.#queue.length > 0;
  }

  /** Queues items. Resolves when the queue is empty or stopped. */
  async add(sources: Iterable<Unread>, signal?: AbortSignal): Promise<void> {
    signal?.throwIfAborted();
    const mine = [...sources];
    if (!this.#running && this.#queue.length === 0) this.#reset();
    this.#queue.push(...mine);
    signal?.addEventListener('abort', () => {
      const leave = new Set<Unread>(mine);
      this.#queue = this.#queue.filter((source) => !leave.has(source));
      this.#report();
    });
    await this.resume();
  }

  /** Reads no further. What is being read is finished and kept; the rest stays queued for `resume`. */
  stop(): void {
    this.#stopped = true;
  }

  async resume(): Promise<void> {
    this.#stopped = false;
    this.#running ??= this.#run();
    await this.#running;
  }

  /** Drops what is queued and waits until nothing is being read. */
  async cancel(): Promise<void> {
    this.#queue = [];
    this.#stopped = true;
    await this.#running?.catch(() => undefined);
    this.#reset();
  }

  #reset(): void {
    this.#done = 0;
    this.#added = 0;
    this.#refused = [];
    this.#duplicates = [];
  }

  async #run(): Promise<void> {
    // The caller has to see this run as running before its first report.
    await Promise.resolve();
    this.#startedAt = undefined;
    const window: Promise<Outcome>[] = [];
    const unread: Unread[] = [];
    let fatal: unknown;
    let delivered = false;
    this.#report();
    for (;;) {
      while (!this.#stopped && window.length < 2 * this.#eyes.size) {
        const source = this.#queue.shift();
        if (!source) break;
        window.push(this.#read(source));
      }
      this.#inHand = window.length;
      const next = window.shift();
      if (!next) {
        if (!delivered) break;
        delivered = false;
        await this.#pause().catch((error: unknown) => (fatal ??= error));
        // More may have been queued meanwhile.
        continue;
      }
      const outcome = await next;
      if (outcome.fatal === undefined) {
        await this.#settle(outcome);
        delivered = true;
      } else {
        fatal ??= outcome.fatal;
        this.#stopped = true;
        unread.push(outcome.source);
      }
      this.#inHand = window.length;
      if (this.#startedAt === undefined) {
        this.#startedAt = performance.now();
        this.#doneAtStart = this.#done;
      }
      if (performance.now() - this.#reportedAt >= REPORT_EVERY) this.#report();
    }
    this.#queue.unshift(...unread);
    this.#running = undefined;
    this.#report();
    // What the person stopped needs no saying.
    if (fatal !== undefined && codeOf(fatal) !== 'fetch-stopped') throw fatal;
  }

  async #read(source: Unread): Promise<Outcome> {
    try {
      return { source, arrival: await this.#eyes.read(source) };
    } catch (error) {
      const code = codeOf(error);
      if (code === 'asset-missing' || code === 'encoder-file' || code === 'fetch-stopped') return { source, fatal: error };
      return { source, refused: { name: source.name, code: code ?? 'unexpected', message: messageOf(error) } };
    }
  }

  async #settle({ source, arrival, refused }: Outcome): Promise<void> {
    this.#done++;
    if (refused) this.#refused.push(refused);
    if (!arrival) return;
    const { fingerprint } = arrival.read;
    const same = this.#known.get(fingerprint);
    try {
      await (same === undefined ? this.#deliver(arrival) : this.#again(arrival));
    } catch (error) {
      this.#refused.push({ name: source.name, code: codeOf(error) ?? 'unexpected', message: messageOf(error) });
      return;
    }
    if (same !== undefined) {
      this.#duplicates.push({ name: source.name, of: same });
      return;
    }
    this.#known.set(fingerprint, source.name);
    this.#added++;
  }

  #report(): void {
    const left = this.#inHand + this.#queue.length;
    const since = this.#done - this.#doneAtStart;
    const elapsed = (performance.now() - (this.#startedAt ?? 0)) / 1000;
    this.#reportedAt = performance.now();
    this.#onProgress({
      done: this.#done,
      total: this.#done + left,
      secondsLeft: this.#startedAt !== undefined && since > 1 ? (elapsed / since) * left : undefined,
      state: this.#running && !this.#stopped ? 'reading' : left > 0 ? 'stopped' : 'finished',
      added: this.#added,
      refused: [...this.#refused],
      duplicates: [...this.#duplicates],
    });
  }
}
