import {
  type Action,
  Aside,
  type Fetched,
  type Item,
  type Kind,
  messageOf,
  type NoteFile,
  type NoteInFile,
  type PileClient,
  type Progress,
  type Ranked,
  type Saved,
  type Snapshot,
  type Source,
  Status,
} from '../kit/client';
import { StripInHand } from './strip-in-hand';
import { asideOf, type BenchView, changedAnswers, layOut, moved, plausibleOf } from './view';
import { words } from './words';

const STRIPS = 'strips';

/** What lies on the bench: the pile, the item in hand, and what has to be said. */
export class Desk {
  readonly client: PileClient;
  readonly #redraw: () => void;
  snapshot: Snapshot | undefined;
  view: BenchView | undefined;
  /** The item in hand. It stays there until it is answered, whatever arrives meanwhile. */
  hand: number | undefined;
  /** Look-alikes to be confirmed at one go, in the place of the question. An item that the person takes lies on top of them. */
  strip: StripInHand | undefined;
  #stripsOn = localStorage.getItem(STRIPS) !== 'off';
  /** Whether the person asked for a strip before its time. */
  #stripWanted = false;
  /** What was taken out of a strip: it is asked about next. */
  #takenOut: number[] = [];
  ranking: Ranked[] = [];
  movedItems: ReadonlySet<number> = new Set();
  progress: Progress | undefined;
  /** How the text encoder arrives, while it does. */
  fetched: Fetched | undefined;
  stopping = false;
  problems: readonly string[] = [];
  said = '';
  #held: 'question' | 'person' = 'question';
  #acting = false;
  #turn: Promise<unknown> = Promise.resolve();
  /** Long notes that were told of. */
  #long = 0;
  /** What was said about a failed save. */
  #unsaved: string | undefined;

  private constructor(client: PileClient, redraw: () => void) {
    this.client = client;
    this.#redraw = redraw;
    client.on('change', () => {
      if (!this.#acting) void this.#show(undefined);
    });
    client.on('progress', ({ detail }) => {
      this.progress = detail;
      if (detail.state !== 'reading') this.stopping = false;
      if (detail.state === 'finished' && detail.total > 0) this.said = words.readAll(this.kind, detail.added);
      if (detail.state === 'finished') this.#tellLong();
      this.#redraw();
    });
    client.on('fetched', ({ detail }) => {
      this.fetched = detail;
      this.#redraw();
    });
    this.#long = this.#countLong();
    client.on('saved', ({ detail }) => this.#saved(detail));
    if (client.notKept !== undefined) this.complain(words.notKept);
  }

  /** A desk with the client's pile already on it. */
  static async lay(client: PileClient, redraw: () => void): Promise<Desk> {
    const desk = new Desk(client, redraw);
    await desk.#show(undefined);
    return desk;
  }

  get items(): readonly Item[] {
    return this.client.items;
  }

  /** What the items are; photos as long as there are none. */
  get kind(): Kind {
    return this.client.kind ?? 'photos';
  }

  get handItem(): Item | undefined {
    return this.hand === undefined ? undefined : this.items[this.hand];
  }

  get handStatus(): number {
    return this.#of(this.hand)?.status ?? Status.sorted;
  }

  /** Where the person put the item in hand. */
  get given(): number | undefined {
    const of = this.#of(this.hand);
    return of?.status === Status.answered ? of.tray : undefined;
  }

  /** Where the sorter puts the item in hand. */
  get guess(): number | undefined {
    const of = this.#of(this.hand);
    return of && of.tray >= 0 && of.status !== Status.answered ? of.tray : undefined;
  }

  /** The trays that can't be ruled out for the item in hand, unless it is answered. */
  get plausible(): readonly number[] | undefined {
    if (this.hand === undefined || !this.snapshot || this.guess === undefined) return undefined;
    return plausibleOf(this.snapshot, this.hand);
  }

  /** Why the sorter sets the item in hand aside, if it does. */
  get setAside(): number {
    return this.hand === undefined || !this.snapshot ? Aside.not : asideOf(this.snapshot.verdicts, this.hand);
  }

  /** The strip, unless an item lies on top of it. */
  get stripInHand(): StripInHand | undefined {
    return this.hand === undefined ? this.strip : undefined;
  }

  /** How many look-alikes could be confirmed at one go instead of the question in hand. */
  get stripInstead(): number {
    return this.outOfTurn ? 0 : (this.snapshot?.strip?.items.length ?? 0);
  }

  get outOfTurn(): boolean {
    if (this.strip) return this.#held === 'person' && this.hand !== undefined;
    return this.#held === 'person' && this.snapshot?.question !== undefined && this.snapshot.question !== this.hand;
  }

  get answers(): number {
    return this.snapshot?.trays.reduce((sum, { answers }) => sum + answers, 0) ?? 0;
  }

  trayName(tray: number): string {
    return this.snapshot?.trays.find((one) => one.tray === tray)?.name ?? '';
  }

  complain(problem: string): void {
    if (!this.problems.includes(problem)) this.problems = [...this.problems, problem];
    this.#redraw();
  }

  say(said: string): void {
    this.said = said;
    this.#redraw();
  }

  dismiss(problem: string): void {
    this.problems = this.problems.filter((one) => one !== problem);
    this.#redraw();
  }

  dismissOutcome(): void {
    this.progress = undefined;
    this.#redraw();
  }

  async add(sources: readonly Source[]): Promise<void> {
    if (sources.length === 0) return;
    await this.client.add(sources).catch((error: unknown) => this.complain(messageOf(error)));
  }

  async addNotes(file: NoteFile, notes: readonly NoteInFile[], name: (note: NoteInFile) => string): Promise<void> {
    try {
      if ((await this.client.addNotes(file, notes, name)) === 0) this.complain(words.notesAgain(file.name));
    } catch (error) {
      this.complain(messageOf(error));
    }
  }

  stop(): void {
    this.stopping = true;
    this.client.stop();
    this.#redraw();
  }

  async goOn(): Promise<void> {
    await this.client.goOn().catch((error: unknown) => this.complain(messageOf(error)));
  }

  take(item: number): void {
    this.hand = item;
    this.#held = 'person';
    void this.#show(undefined);
  }

  backToQuestion(): void {
    this.hand = undefined;
    void this.#show(undefined);
  }

  /** Lays out a strip at once, and others when their time has come; or single questions only from now on. */
  async offerStrips(on: boolean): Promise<void> {
    this.#stripsOn = on;
    localStorage.setItem(STRIPS, on ? 'on' : 'off');
    this.strip = undefined;
    this.hand = undefined;
    this.#stripWanted = on;
    await this.#show(undefined);
    this.#stripWanted = false;
  }

  /** Takes an item out of the strip, or back into it. */
  toggle(item: number): void {
    this.strip?.toggle(item);
    this.#redraw();
  }

  /** Puts what stays in the strip into its tray, another or a new one. What was taken out is asked about next. */
  async answerStrip(to: number | string | undefined = this.strip?.tray): Promise<void> {
    const strip = this.stripInHand;
    if (!strip?.ready || to === undefined) return;
    const items = strip.staying;
    this.#takenOut = [...strip.out];
    if (items.length === 0) {
      this.strip = undefined;
      this.said = words.stripLeft;
      return this.#show(undefined);
    }
    const name = typeof to === 'string' ? to : this.trayName(to);
    const action: Action = typeof to === 'string' ? { do: 'answer-all-new', items, name: to } : { do: 'answer-all', items, tray: to };
    const problem = await this.#act(action, items, words.placedAll(this.kind, items.length, name));
    if (problem !== undefined) this.#takenOut = [];
  }

  /** Answers for an item: the one in hand unless another is named. Then the next question comes. */
  async answer(tray: number, item = this.hand): Promise<void> {
    if (item === undefined) return this.answerStrip(tray);
    await this.#act({ do: 'answer', item, tray }, [item], words.placed(this.trayName(tray)));
  }

  /** The person looked at a doubted answer again. */
  async settleDoubt(item: number, tray: number): Promise<void> {
    await this.#act({ do: 'settle-doubt', item, tray }, [], words.placed(this.trayName(tray)));
  }

  async answerNew(name: string): Promise<void> {
    const item = this.hand;
    if (item === undefined) return this.answerStrip(name);
    await this.#act({ do: 'answer-new', item, name }, [item], words.placed(name));
  }

  async none(item = this.hand): Promise<void> {
    if (item !== undefined) await this.#act({ do: 'none', item }, [item], words.placedAside);
  }

  async skip(item = this.hand): Promise<void> {
    if (item !== undefined) await this.#act({ do: 'skip', item }, [item], words.placedSkip);
  }

  async withdraw(): Promise<void> {
    const item = this.hand;
    if (item === undefined) return;
    await this.#act({ do: 'withdraw', item }, [], words.withdrawn);
  }

  async removeItem(item = this.hand): Promise<void> {
    if (item === undefined) return;
    await this.#act({ do: 'remove-item', item }, [item], words.takenOut(this.items[item]?.name ?? ''));
  }

  async renameTray(tray: number, name: string): Promise<string | undefined> {
    return this.#act({ do: 'rename-tray', tray, name }, [], words.trayRenamed(name));
  }

  async mergeTrays(from: number, into: number): Promise<string | undefined> {
    const said = words.trayMerged(this.trayName(from), this.trayName(into));
    return this.#act({ do: 'merge-trays', from, into }, [], said);
  }

  async removeTray(tray: number): Promise<string | undefined> {
    return this.#act({ do: 'remove-tray', tray }, [], words.trayRemoved(this.trayName(tray)));
  }

  async undo(): Promise<void> {
    await this.#step('undo');
  }

  async redo(): Promise<void> {
    await this.#step('redo');
  }

  async clear(): Promise<void> {
    await this.client.clear();
    this.progress = undefined;
    this.problems = [];
    this.hand = undefined;
    this.strip = undefined;
    this.#takenOut = [];
    this.said = '';
    this.#long = 0;
    await this.#show(undefined);
  }

  #countLong(): number {
    return this.items.reduce((sum, item) => sum + Number('text' in item && item.parts > 1), 0);
  }

  #tellLong(): void {
    const long = this.#countLong();
    if (long > this.#long) this.complain(words.longNotes(long - this.#long));
    this.#long = long;
  }

  #of(item: number | undefined): { tray: number; status: number } | undefined {
    const verdicts = this.snapshot?.verdicts;
    if (item === undefined || !verdicts || item >= verdicts.status.length) return undefined;
    return { tray: verdicts.tray[item] ?? -1, status: verdicts.status[item] ?? 0 };
  }

  /** One after the other, so that fast fingers never answer for an item they have not seen the place of. */
  async #inTurn<T>(work: () => Promise<T>): Promise<T> {
    const turn = this.#turn.then(work, work);
    this.#turn = turn.catch(() => undefined);
    return turn;
  }

  /** `settled`: the items that have had their answer with this. Resolves to what went wrong, if so. */
  #act(action: Action, settled: readonly number[], said: string): Promise<string | undefined> {
    const start = performance.now();
    return this.#inTurn(async () => {
      this.#acting = true;
      try {
        await this.client.act(action);
      } catch (error) {
        this.complain(messageOf(error));
        return messageOf(error);
      } finally {
        this.#acting = false;
      }
      const after = this.client.snapshot;
      const others = after ? moved(this.snapshot, after, settled) : new Set<number>();
      this.said = `${said} ${words.moved(others.size)}`;
      if (this.hand !== undefined && settled.includes(this.hand)) this.hand = undefined;
      if (action.do === 'answer-all' || action.do === 'answer-all-new') this.strip = undefined;
      await this.#show(others);
      performance.measure('answer to sorted pile', { start, end: performance.now() });
      return undefined;
    });
  }

  async #step(way: 'undo' | 'redo'): Promise<void> {
    await this.#inTurn(async () => {
      const before = this.snapshot;
      this.#acting = true;
      const kind = await this.client.act({ do: way }).finally(() => (this.#acting = false));
      const after = this.client.snapshot;
      if (kind === undefined || !before || !after) return;
      const changed = changedAnswers(before, after);
      const [item] = changed;
      this.#takenOut = [];
      const tray = item === undefined ? undefined : before.verdicts.tray[item];
      if (way === 'undo' && kind === 'answer' && changed.length > 1 && tray !== undefined && this.#stripsOn) {
        this.strip = new StripInHand({ tray, items: changed }, this.#redraw);
        this.hand = undefined;
      } else if (way === 'undo' && item !== undefined && after.verdicts.status[item] !== Status.removed) {
        this.hand = item;
        this.#held = 'person';
      } else if (way === 'redo' && this.hand !== undefined && changed.includes(this.hand)) {
        this.hand = undefined;
      }
      this.said = way === 'undo' ? words.undid(kind) : words.redid(kind);
      await this.#show(moved(before, after, []));
    });
  }

  /** Shows the client's snapshot; with it the ranking of the item in hand, so that the two never disagree. */
  async #show(others: Set<number> | undefined): Promise<void> {
    const snapshot = this.client.snapshot;
    if (this.hand !== undefined && (!snapshot || snapshot.verdicts.status[this.hand] === Status.removed)) this.hand = undefined;
    if (this.strip && !(snapshot && this.strip.keepOpen(snapshot))) this.strip = undefined;
    if (this.hand === undefined && !this.strip) this.#ask(snapshot);
    const hand = this.hand;
    const ranking = snapshot && hand !== undefined && snapshot.trays.length > 0 ? await this.client.ranking(hand).catch(() => []) : [];
    if (snapshot !== this.client.snapshot && others === undefined) return;
    this.ranking = ranking;
    this.snapshot = snapshot;
    this.view = snapshot && layOut(snapshot, this.items);
    if (others) this.movedItems = others;
    this.#redraw();
  }

  /** What was taken out of a strip comes first, then a strip, if one is offered and wanted, else the question. */
  #ask(snapshot: Snapshot | undefined): void {
    this.#held = 'question';
    this.#takenOut = this.#takenOut.filter((item) => snapshot?.verdicts.status[item] === Status.sorted);
    const strip = this.#stripsOn && (snapshot?.strip?.due || this.#stripWanted) ? snapshot?.strip : undefined;
    if (this.#takenOut.length === 0 && strip) this.strip = new StripInHand(strip, this.#redraw);
    else this.hand = this.#takenOut[0] ?? snapshot?.question;
  }

  #saved(saved: Saved): void {
    if (this.#unsaved !== undefined) this.dismiss(this.#unsaved);
    if (!saved.ok) {
      this.#unsaved = words.notSaved(saved.full, saved.message);
      this.complain(this.#unsaved);
      return;
    }
    if (this.#unsaved !== undefined) {
      this.#unsaved = undefined;
      this.said = words.savedAgain;
      this.#redraw();
    }
    if ('withoutOriginals' in saved) this.complain(words.withoutOriginals);
  }
}
