import { type Judgement, messageOf, type Snapshot, type SpotCheckPlan, type Terms, type Trust as Known } from '../kit/client';
import type { Desk } from './desk';
import { save } from './result';
import { count, words } from './words';

export type TrustTab = 'sure' | 'doubts' | 'check';

/** What the panel about trust shows. */
export interface TrustView {
  tab: TrustTab;
  snapshot: Snapshot;
  /** Absent until it is reckoned. */
  known: Known | undefined;
  /** The accuracy that the number of further answers is told for. */
  target: number;
  plan: Required<SpotCheckPlan>;
  /** What the plan takes. */
  size: { items: number; size: number } | undefined;
  said: string;
  problem: string;
}

/** Beyond this many answers the line above the shelves does not reckon by itself, since that would take a while. */
const LINE_LIMIT = 200;
/** How long nothing has to change before it does, in milliseconds. */
const LINE_AFTER = 500;

const NOTE = 'spot-check-note.txt';

function today(): string {
  const now = new Date();
  return [now.getFullYear(), now.getMonth() + 1, now.getDate()].map((part) => String(part).padStart(2, '0')).join('-');
}

/** How far the sorting can be relied on, as the page shows it, and what the person does about it. */
export class Trust {
  #desk: Desk;
  readonly #redraw: () => void;
  /** Tells that a statement was made. */
  readonly #stated: () => void;
  #tab: TrustTab = 'sure';
  #known: Known | undefined;
  #knownOf: Snapshot | undefined;
  #asking = false;
  /** How often something else was asked of the same pile. */
  #asked = 0;
  #target = 0.95;
  #plan: Required<SpotCheckPlan> = { tolerance: 0.05, confidence: 0.95, allowed: 0, byTray: false };
  #size: { items: number; size: number } | undefined;
  #said = '';
  #problem = '';
  #soon: ReturnType<typeof setTimeout> | undefined;
  #turn: Promise<unknown> = Promise.resolve();

  constructor(desk: Desk, redraw: () => void, stated: () => void) {
    this.#desk = desk;
    this.#stated = stated;
    this.#redraw = redraw;
  }

  /** Does what parts of the page ask for. */
  serve(root: EventTarget): void {
    const on = <T>(type: string, act: (detail: T) => void) =>
      root.addEventListener(type, (event) => act((event as CustomEvent<T>).detail));
    on<{ tab: TrustTab }>('trust-tab', ({ tab }) => this.#show(tab));
    on<{ target: number }>('trust-target', ({ target }) => {
      this.#target = target;
      this.#again();
    });
    on<{ changed: Partial<Terms> }>('terms', ({ changed }) => void this.#setTerms(changed));
    on<{ item: number; tray: number; stays: boolean }>('settle-doubt', ({ item, tray, stays }) => void this.#settle(item, tray, stays));
    on('undo-settled', () => void this.#desk.undo());
    on<{ plan: Required<SpotCheckPlan> }>('plan', ({ plan }) => {
      this.#plan = plan;
      this.#again();
    });
    on<{ item: number; judgement: Judgement | null }>('judge', ({ item, judgement }) => void this.#do(() => this.#desk.client.judge(item, judgement).then(() => '')));
    on('state-check', () => void this.#state());
    on('drop-check', () => void this.#do(() => this.#desk.client.dropCheck().then(() => words.trust.dropped)));
    on('copy-statement', () => void this.#copy());
    on('save-note', () => this.#note());
  }

  get problem(): string {
    return this.#problem;
  }

  /** A panel that opens tells nothing old. */
  open(tab: TrustTab = this.#tab): void {
    this.#said = '';
    this.#problem = '';
    this.#show(tab);
  }

  /** Draws a spot check as planned. Resolves to whether there is one. */
  async start(): Promise<boolean> {
    const seed = (crypto.getRandomValues(new Uint32Array(1))[0] ?? 0) % 1_000_000;
    return this.#do(() => this.#desk.client.startCheck(this.#plan, seed).then(() => ''));
  }

  view(): TrustView | undefined {
    const { snapshot } = this.#desk;
    if (!snapshot) return undefined;
    if (snapshot !== this.#knownOf) void this.#ask(snapshot);
    return {
      tab: this.#tab,
      snapshot,
      known: this.#known,
      target: this.#target,
      plan: this.#plan,
      size: this.#size,
      said: this.#said,
      problem: this.#problem,
    };
  }

  /** What the line above the shelves tells; reckoned when the person pauses. */
  line(): Known | undefined {
    const { snapshot, answers } = this.#desk;
    if (!snapshot || answers < 3 || answers > LINE_LIMIT) return undefined;
    if (snapshot !== this.#knownOf) {
      clearTimeout(this.#soon);
      this.#soon = setTimeout(() => {
        if (this.#desk.snapshot === snapshot) void this.#ask(snapshot);
      }, LINE_AFTER);
    }
    return this.#known;
  }

  /** Is about another kit from now on. */
  change(desk: Desk): void {
    this.#desk = desk;
    this.#asking = false;
    this.#asked++;
    this.forget();
  }

  /** The pile is gone. */
  forget(): void {
    this.#known = undefined;
    this.#knownOf = undefined;
    this.#size = undefined;
  }

  #show(tab: TrustTab): void {
    this.#tab = tab;
    this.#redraw();
  }

  #again(): void {
    this.#asked++;
    this.#knownOf = undefined;
    this.#redraw();
  }

  async #ask(snapshot: Snapshot): Promise<void> {
    if (this.#asking) return;
    this.#asking = true;
    const asked = this.#asked;
    const { client } = this.#desk;
    try {
      const [known, size] = await Promise.all([
        client.trust(this.#target),
        // Nothing that the sorter sorted: nothing to check.
        client.spotCheckSize(this.#plan).catch(() => undefined),
      ]);
      if (asked !== this.#asked) return;
      this.#known = known;
      this.#size = size;
    } catch (error) {
      this.#problem = messageOf(error);
    } finally {
      this.#asking = false;
      // What was asked meanwhile is asked again.
      this.#knownOf = asked === this.#asked ? snapshot : undefined;
      this.#redraw();
    }
  }

  /** One after the other. Resolves to whether it was done. */
  async #do(work: () => Promise<string>): Promise<boolean> {
    const turn = this.#turn.then(async () => {
      try {
        this.#problem = '';
        this.#said = await work();
        return true;
      } catch (error) {
        this.#problem = messageOf(error);
        return false;
      } finally {
        this.#redraw();
      }
    });
    this.#turn = turn;
    return turn;
  }

  async #setTerms(changed: Partial<Terms>): Promise<void> {
    const { client } = this.#desk;
    await this.#do(async () => {
      if (!client.snapshot) return '';
      await client.setTerms({ ...client.snapshot.terms, ...changed });
      return words.trust.termsSet;
    });
  }

  async #settle(item: number, tray: number, stays: boolean): Promise<void> {
    const name = this.#desk.trayName(tray);
    await this.#do(async () => {
      await this.#desk.settleDoubt(item, tray);
      return stays ? words.trust.kept(name) : words.trust.changed(name);
    });
  }

  async #state(): Promise<void> {
    const stated = await this.#do(() => this.#desk.client.stateCheck(today()).then(() => words.trust.stated));
    if (!stated) return;
    this.#tab = 'check';
    this.#stated();
  }

  async #copy(): Promise<void> {
    const sentence = this.#desk.snapshot?.check?.statement?.sentence;
    if (sentence === undefined) return;
    await this.#do(async () => {
      try {
        await navigator.clipboard.writeText(sentence);
      } catch {
        throw new Error(words.trust.cantCopy);
      }
      return words.trust.copied;
    });
  }

  /** A note to hand over with the result. */
  #note(): void {
    const { snapshot, view } = this.#desk;
    const { statement, aboutNow, plan } = snapshot?.check ?? {};
    if (!snapshot || !statement || !plan || !view) return;
    const lines = [
      words.trust.noteTitle,
      '',
      `${statement.sentence}.`,
      '',
      aboutNow ? words.trust.aboutNow : words.trust.aboutEarlier,
      statement.holds ? words.trust.holds(plan.tolerance) : words.trust.holdsNot(plan.tolerance),
      words.trust.noteRest(view.tally.answered, view.tally.aside),
      '',
      ...statement.trays.map(({ tray, items, lookedAt, wrong, untold }) =>
        words.trust.noteTray(this.#desk.trayName(tray), count(items), count(lookedAt), count(wrong), count(untold)),
      ),
      '',
      words.caution,
      '',
    ];
    save(new Blob([lines.join('\r\n')], { type: 'text/plain' }), NOTE);
    this.#said = words.resultTaken(NOTE);
    this.#redraw();
  }
}
