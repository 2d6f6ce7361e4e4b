import {
  codeOf,
  messageOf,
  NOTHING,
  type PastPile,
  PastPiles,
  type PileStarter,
  type Snapshot,
  type Source,
  type StarterFacts,
} from '../kit/client';
import type { Desk } from './desk';
import { save } from './result';
import { words } from './words';

/** What the pile on the bench has to do with past piles. */
export interface PileView {
  answers: number;
  trays: number;
  /** Whether its answers are enough to learn from. */
  teachable: boolean;
  /** What it taught already. */
  taught: PastPile | undefined;
  starter: PileStarter | undefined;
  /** Another starter that it could start from. */
  offer: StarterFacts | undefined;
}

/** The starters for one encoder's items, and the one that the next pile starts from. */
export interface NextView {
  encoder: string;
  starters: readonly StarterFacts[];
  chosen: string;
}

export interface PastView {
  pile: PileView | undefined;
  /** Whether the moment has come to offer learning. */
  offered: boolean;
  next: readonly NextView[];
  piles: readonly PastPile[];
  /** How much of learning is done; absent while nothing is learned. */
  learning: number | undefined;
  problem: string;
  said: string;
}

const FILE = 'past-piles.starter';

/** Whether a file is meant as a starter. */
export function isStarter({ name }: Source): boolean {
  return /^[^/]+\.starter$/i.test(name);
}

/** Past piles and what is being done with them. */
export class Past {
  readonly #piles: PastPiles;
  readonly #redraw: () => void;
  #stopper: AbortController | undefined;
  #learning: number | undefined;
  #problem = '';
  #said = '';
  /** The pile whose result was taken. */
  #finished: string | undefined;

  private constructor(piles: PastPiles, redraw: () => void) {
    this.#piles = piles;
    this.#redraw = redraw;
  }

  /** `undefined` where the browser keeps nothing for the page. */
  static async open(redraw: () => void): Promise<Past | undefined> {
    const piles = await PastPiles.open().catch(() => undefined);
    return piles && new Past(piles, redraw);
  }

  /** Does what parts of the page ask for, with the desk there is by then. */
  serve(root: EventTarget, now: () => Desk | undefined): void {
    const on = <T>(type: string, act: (detail: T) => void) =>
      root.addEventListener(type, (event) => act((event as CustomEvent<T>).detail));
    on('stop-learning', () => this.#stopper?.abort());
    const withDesk = (act: (desk: Desk) => void) => {
      const desk = now();
      if (desk) act(desk);
    };
    on('choose-starter', () => withDesk((desk) => this.#chooseFile(desk)));
    on<{ to: string | boolean }>('start-from', ({ to }) => withDesk((desk) => void this.#startFrom(desk, to)));
    on<{ encoder: string; key: string }>('past-next', ({ encoder, key }) => void this.#choose(encoder, key));
    on<{ starter: StarterFacts }>('share-starter', ({ starter }) => void this.#share(starter));
    on<{ key: string }>('drop-starter', ({ key }) => void this.#drop(key));
    on<{ id: string }>('forget-pile', ({ id }) => void this.#forget(id));
    on('forget-all', () => void this.#forgetAll());
  }

  view(snapshot: Snapshot | undefined): PastView {
    const { piles, starters } = this.#piles;
    const encoders = [...new Set([...starters, ...piles].map(({ encoder }) => encoder))].sort();
    const next = encoders.map((encoder): NextView => ({
      encoder,
      starters: starters.filter((one) => one.encoder === encoder),
      chosen: this.#piles.forNext(encoder)?.key ?? NOTHING,
    }));
    const pile = snapshot && this.#pile(snapshot);
    const done = snapshot !== undefined && (this.#finished === snapshot.id || snapshot.question === undefined);
    const offered = done && pile?.teachable === true && pile.taught?.items !== pile.answers;
    return { pile, offered, next, piles, learning: this.#learning, problem: this.#problem, said: this.#said };
  }

  #pile({ id, encoder, trays, starter }: Snapshot): PileView {
    const answered = trays.filter(({ answers }) => answers > 0);
    const answers = answered.reduce((sum, tray) => sum + tray.answers, 0);
    const next = this.#piles.forNext(encoder);
    return {
      answers,
      trays: answered.length,
      teachable: answered.length >= 2 && answers > answered.length,
      taught: this.#piles.piles.find((one) => one.id === id),
      starter,
      offer: next && next.identity !== starter?.identity && !next.piles.includes(id) ? next : undefined,
    };
  }

  /** The pile's result was taken: the moment to offer learning from it. */
  finish(snapshot: Snapshot | undefined): void {
    this.#finished = snapshot?.id;
  }

  /** A panel that opens tells nothing old. */
  hush(): void {
    if (this.#learning !== undefined) return;
    this.#problem = '';
    this.#said = '';
  }

  /** Learns from the pile on the bench. Resolves to what is to be said. */
  async learn(desk: Desk): Promise<string> {
    if (this.#learning !== undefined || !desk.snapshot) return '';
    const { answers, trays } = this.#pile(desk.snapshot);
    return this.#long(async (watched) => {
      await this.#piles.teach(await desk.client.finished(), watched);
      return words.learned(answers, trays);
    });
  }

  async #forget(pile: string): Promise<void> {
    if (this.#learning === undefined) await this.#long((watched) => this.#piles.forget(pile, watched).then(() => words.forgot));
  }

  async #forgetAll(): Promise<void> {
    if (this.#learning === undefined) await this.#short(() => this.#piles.forgetAll().then(() => words.forgotAll));
  }

  async #choose(encoder: string, key: string): Promise<void> {
    await this.#short(() => this.#piles.choose(encoder, key).then(() => ''));
  }

  async #drop(key: string): Promise<void> {
    await this.#short(() => this.#piles.drop(key).then(() => words.starterDeleted));
  }

  /** Keeps the starters of these files; one sentence for each that is none. */
  async take(sources: readonly Source[], desk: Desk): Promise<void> {
    for (const { name, blob } of sources) {
      await this.#short(async () => {
        const starter = await this.#piles.take(typeof blob === 'function' ? await blob() : blob, name, await desk.client.encoders());
        return starter ? words.starterTaken(name, starter.categories) : '';
      }, name);
    }
  }

  #chooseFile(desk: Desk): void {
    const input = document.createElement('input');
    input.type = 'file';
    input.accept = '.starter';
    input.addEventListener('change', () => void this.take([...(input.files ?? [])].map((file) => ({ name: file.name, blob: file })), desk));
    input.click();
  }

  async #share({ key, categories }: StarterFacts): Promise<void> {
    await this.#short(async () => {
      try {
        save(await this.#piles.share(key), FILE);
      } catch (error) {
        if (codeOf(error) === 'too-few-to-share') throw new Error(words.tooFewToShare(categories));
        throw error;
      }
      return words.starterSaved(FILE);
    });
  }

  async #startFrom(desk: Desk, to: string | boolean): Promise<void> {
    await this.#short(async () => {
      await desk.client.changeStarter(to);
      return to === false ? words.startsOff : words.startsNow;
    });
  }

  async #short(work: () => Promise<string>, file?: string): Promise<void> {
    this.#problem = '';
    this.#said = '';
    try {
      this.#said = await work();
    } catch (error) {
      const code = codeOf(error);
      this.#problem = (file !== undefined && code !== undefined && words.starterProblems[code]?.(file)) || messageOf(error);
    }
    this.#redraw();
  }

  async #long(work: (watched: { signal: AbortSignal; onProgress: (done: number) => void }) => Promise<string>): Promise<string> {
    const stopper = new AbortController();
    this.#stopper = stopper;
    this.#learning = 0;
    this.#redraw();
    const onProgress = (done: number) => {
      // Messages may still be under way when all is over.
      if (this.#stopper !== stopper) return;
      this.#learning = done;
      this.#redraw();
    };
    await this.#short(async () => {
      try {
        return await work({ signal: stopper.signal, onProgress });
      } catch (error) {
        if (stopper.signal.aborted) return words.learningStopped;
        throw error;
      } finally {
        this.#stopper = undefined;
        this.#learning = undefined;
      }
    });
    return this.#problem || this.#said;
  }
}
