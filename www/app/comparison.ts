import { codeOf, type Hindsight, messageOf } from '../kit/client';
import type { Desk } from './desk';
import { words } from './words';

/** What the panel shows. */
export interface ComparisonView {
  /** Whether the moment has come to offer it. */
  offered: boolean;
  /** How much is done; absent while nothing is worked out. */
  working: number | undefined;
  found: Hindsight | undefined;
  /** Whether answers were given since. */
  stale: boolean;
  said: string;
}

/** The person's answers beside random order, worked out when it is asked for. */
export class Comparison {
  readonly #redraw: () => void;
  #stopper: AbortController | undefined;
  #working: number | undefined;
  #found: { pile: string; verdicts: object; hindsight: Hindsight } | undefined;
  #said = '';
  /** The pile whose result was taken. */
  #finished: string | undefined;

  constructor(redraw: () => void) {
    this.#redraw = redraw;
  }

  view({ snapshot }: Desk): ComparisonView {
    const found = this.#found?.pile === snapshot?.id ? this.#found : undefined;
    const stale = found !== undefined && found.verdicts !== snapshot?.verdicts;
    const done = snapshot !== undefined && (this.#finished === snapshot.id || snapshot.strip?.due === true);
    const offered = done && snapshot.outlook !== undefined && (found === undefined || stale);
    return { offered, working: this.#working, found: found?.hindsight, stale, said: this.#said };
  }

  /** The pile's result was taken: the moment to offer it. */
  finish({ snapshot }: Desk): void {
    this.#finished = snapshot?.id;
  }

  async work({ client, snapshot }: Desk): Promise<void> {
    if (this.#working !== undefined || !snapshot) return;
    this.#said = '';
    this.#working = 0;
    const stopper = new AbortController();
    this.#stopper = stopper;
    this.#redraw();
    const onProgress = (done: number) => {
      // Progress comes by a way of its own, and may come after the end.
      if (this.#stopper !== stopper) return;
      this.#working = done;
      this.#redraw();
    };
    try {
      const hindsight = await client.hindsight({ signal: stopper.signal, onProgress });
      this.#found = { pile: snapshot.id, verdicts: snapshot.verdicts, hindsight };
    } catch (error) {
      const stopped = stopper.signal.aborted;
      const little = codeOf(error) === 'too-little-to-tell';
      this.#said = stopped ? words.compareStopped : little ? words.compareTooLittle : messageOf(error);
    } finally {
      this.#working = undefined;
      this.#stopper = undefined;
      this.#redraw();
    }
  }

  stop(): void {
    this.#stopper?.abort();
  }
}
