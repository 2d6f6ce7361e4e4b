import { messageOf } from './error';
import type { Addition, Store, NewState } from './store';

export type Saved =
  | { ok: true }
  /** Thumbnails and answers are kept, the original photos no longer. */
  | { ok: true; withoutOriginals: true }
  | { ok: false; full: boolean; message: string };

function isFull(error: unknown): boolean {
  return error instanceof DOMException && error.name === 'QuotaExceededError';
}

/**
 * Writes changes in the order they happen, never two at once. What could not be written stays queued and goes with the
 * next change, so that the store is complete again as soon as there is room.
 */
export class Saver {
  readonly #store: Store;
  readonly #report: (saved: Saved) => void;
  #additions: Addition[] = [];
  #state: NewState | undefined;
  #running: Promise<void> | undefined;
  #keepOriginals = true;

  constructor(store: Store, report: (saved: Saved) => void) {
    this.#store = store;
    this.#report = report;
  }

  /** Without a state, only the additions are written: the state that lies in the store stays good for the items before them. */
  save(additions: readonly Addition[], state: NewState | undefined): void {
    this.#additions.push(...additions);
    this.#state = state ?? this.#state;
    this.#running ??= this.#run().finally(() => (this.#running = undefined));
  }

  /** What could not be written yet. */
  get unwritten(): readonly Addition[] {
    return this.#additions;
  }

  /** Resolves when nothing is left to write, or when writing failed. */
  async settled(): Promise<void> {
    await this.#running;
  }

  /** Forgets what was not written yet and empties the store. */
  async clear(): Promise<void> {
    this.#additions = [];
    this.#state = undefined;
    await this.#running;
    await this.#store.clear();
    this.#keepOriginals = true;
  }

  async #run(): Promise<void> {
    while (this.#state !== undefined || this.#additions.length > 0) {
      const additions = this.#additions;
      const state = this.#state;
      this.#additions = [];
      this.#state = undefined;
      try {
        await this.#write(additions, state);
      } catch (error) {
        this.#additions = [...additions, ...this.#additions];
        this.#state ??= state;
        this.#report({ ok: false, full: isFull(error), message: messageOf(error) });
        return;
      }
    }
  }

  async #write(additions: readonly Addition[], state: NewState | undefined): Promise<void> {
    if (this.#keepOriginals) {
      try {
        await this.#store.write(additions, state);
        this.#report({ ok: true });
        return;
      } catch (error) {
        if (!additions.some(({ pictures }) => pictures?.original)) throw error;
        // A file that was moved or deleted meanwhile fails as well; only a full device means no more originals.
        if (isFull(error)) this.#keepOriginals = false;
      }
    }
    const small = additions.map(
      ({ pictures, ...rest }): Addition => (pictures ? { ...rest, pictures: { thumbnail: pictures.thumbnail } } : rest),
    );
    await this.#store.write(small, state);
    this.#report(this.#keepOriginals ? { ok: true } : { ok: true, withoutOriginals: true });
  }
}
