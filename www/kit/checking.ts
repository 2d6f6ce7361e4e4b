import { type Judgement, type Sampled, type Sorter, SpotCheck, type SpotCheckPlan, type Statement } from './core';
import { KenspeckleError } from './error';

/** How a spot check lies in the store: in the core's own words, with the day on which it was stated. */
export interface StoredCheck {
  check: string;
  date: string | undefined;
}

/** A spot check as it stands. */
export interface CheckView {
  plan: Required<SpotCheckPlan>;
  /** How many sorted items it is about. */
  items: number;
  sample: Sampled[];
  left: number;
  /** Once the person stated it. */
  statement: Statement | undefined;
  /** Whether the statement is about the pile as it is sorted now. */
  aboutNow: boolean;
}

/** The one spot check of a pile. It holds still what was drawn, whatever becomes of the pile meanwhile. */
export class Checking {
  #check: SpotCheck | undefined;
  #date: string | undefined;
  /** What `#check` is in its own words, as long as that is known. */
  #words: string | undefined;

  /** Takes up what was kept; a check that can't be read is gone. */
  open(stored: StoredCheck | undefined): void {
    this.clear();
    if (!stored) return;
    try {
      this.#check = SpotCheck.restore(stored.check);
      this.#date = stored.date;
      this.#words = stored.check;
    } catch {
      this.#check = undefined;
    }
  }

  clear(): void {
    this.#check?.free();
    this.#check = undefined;
    this.#date = undefined;
    this.#words = undefined;
  }

  get stored(): StoredCheck | undefined {
    if (!this.#check) return undefined;
    this.#words ??= this.#check.state();
    return { check: this.#words, date: this.#date };
  }

  start(sorter: Sorter, plan: SpotCheckPlan, seed: number): void {
    const drawn = sorter.spotCheck(plan, seed);
    this.clear();
    this.#check = drawn;
  }

  judge(item: number, judgement: Judgement | null): void {
    this.#under.judge(item, judgement);
    this.#words = undefined;
  }

  /** What was looked at becomes answers, and the sentence gets its date. */
  state(sorter: Sorter, date: string): void {
    this.#under.statement(date);
    sorter.answerChecked(this.#under);
    this.#date = date;
  }

  /** Ends it without a statement; what was looked at becomes answers all the same. */
  giveUp(sorter: Sorter): void {
    if (this.#check && this.#date === undefined && this.#check.sample().some(({ judgement }) => judgement !== null)) {
      sorter.answerChecked(this.#check);
    }
    this.clear();
  }

  view(sorter: Sorter): CheckView | undefined {
    const check = this.#check;
    if (!check) return undefined;
    const statement = this.#date === undefined ? undefined : check.statement(this.#date);
    const aboutNow = statement !== undefined && sorter.isAboutNow(check);
    return { plan: check.plan, items: check.items, sample: check.sample(), left: check.left, statement, aboutNow };
  }

  /** One that is under way. */
  get #under(): SpotCheck {
    if (!this.#check || this.#date !== undefined) {
      throw new KenspeckleError('no-spot-check', 'No spot check is under way: draw one first.');
    }
    return this.#check;
  }
}
