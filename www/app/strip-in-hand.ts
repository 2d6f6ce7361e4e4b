import { type Snapshot, Status, type Strip } from '../kit/client';

/** Nobody can have looked at a whole strip sooner than this, in milliseconds: keys that come before were meant for what was there before it. */
const LOOK = 600;

/** A strip that the person looks at: it stays as it is until it is answered or put away, whatever the core would offer meanwhile. */
export class StripInHand {
  readonly tray: number;
  #items: readonly number[];
  #out: ReadonlySet<number> = new Set();
  #ready = false;

  constructor({ tray, items }: Pick<Strip, 'tray' | 'items'>, ready: () => void) {
    this.tray = tray;
    this.#items = items;
    setTimeout(() => {
      this.#ready = true;
      ready();
    }, LOOK);
  }

  /** Whether it has been there long enough to be answered. */
  get ready(): boolean {
    return this.#ready;
  }

  get items(): readonly number[] {
    return this.#items;
  }

  /** What the person took out. */
  get out(): ReadonlySet<number> {
    return this.#out;
  }

  /** What goes into the tray. */
  get staying(): number[] {
    return this.#items.filter((item) => !this.#out.has(item));
  }

  toggle(item: number): void {
    const out = new Set(this.#out);
    if (!out.delete(item) && this.#items.includes(item)) out.add(item);
    this.#out = out;
  }

  /** Drops what has an answer meanwhile. Resolves to whether anything is left to answer. */
  keepOpen(snapshot: Snapshot): boolean {
    const open = (item: number) => snapshot.verdicts.status[item] === Status.sorted;
    if (!snapshot.trays.some(({ tray }) => tray === this.tray)) return false;
    if (!this.#items.every(open)) this.#items = this.#items.filter(open);
    return this.#items.length > 0;
  }
}
