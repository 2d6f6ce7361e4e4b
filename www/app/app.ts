import { html, LitElement, nothing, type TemplateResult } from 'lit';
import { KenspeckleError, type Kind, kindOf, messageOf, PileClient, Readers, type Source } from '../kit/client';
import './band';
import { BenchKits } from './bench-kits';
import { hasCamera } from './camera';
import { Comparison } from './comparison';
import './comparison-panel';
import { Desk } from './desk';
import { demoNotes, demoSources, type Found, fromClipboard, fromList, fromTransfer } from './files';
import { commandOf, isTyping } from './keys';
import { appStyles } from './app-styles';
import './kits-panel';
import { isNotes, NotesIn } from './notes-in';
import './notes-panel';
import { type Panel } from './panels';
import './panels';
import type { Question } from './question';
import './question';
import './outlook-line';
import './reading';
import type { Shelves } from './shelves';
import './shelves';
import { handOver } from './result';
import { isStarter, Past } from './past';
import './past-panel';
import './spot-check';
import './starter-line';
import { shared } from './styles';
import { Trust } from './trust';
import './trust-line';
import './trust-panel';
import './welcome';
import { words } from './words';

/** What is to be added, sorted by what it is. */
type Coming = { kind: 'photos'; sources: readonly Source[] } | { kind: 'notes'; sources: readonly Source[] } | { kind: 'notes'; lines: string };

type Opened =
  | { panel: 'help' | 'start-over' | 'camera' | 'past' | 'kits' | 'notes' | 'trust' | 'spot-check' | 'compare' }
  | { panel: 'write'; text: string }
  | { panel: 'other-kind'; coming: Coming }
  | { panel: 'zoom'; item: number }
  | { panel: 'tray'; tray: number; error?: string };

const SINGLE_KEYS = 'single-keys';
/** Whether to expect a pile before the store is open: the empty page would flash up otherwise. */
const HAS_PILE = 'has-pile';

const NONE: ReadonlySet<number> = new Set();

const brand = html`<svg viewBox="0 0 64 64" aria-hidden="true"><rect x="11" y="12" width="11" height="11" rx="2"/><rect x="26.500" y="12" width="11" height="11" rx="2"/><rect x="42" y="12" width="11" height="11" rx="2"/><rect class="bright" x="21" y="27" width="22" height="22" rx="3"/><rect x="9" y="50.500" width="46" height="5" rx="2"/></svg>
  <span>${words.brand}</span>`;

/** What a kit is called that begins with these. */
function nameFor(coming: Coming): string {
  if ('lines' in coming) return words.newKitName.notes;
  const { kind, sources } = coming;
  const [first] = sources;
  const folder = first?.name.includes('/') ? first.name.split('/')[0] : undefined;
  if (folder && sources.every(({ name }) => name.startsWith(`${folder}/`))) return folder;
  return kind === 'notes' && sources.length === 1 && first ? first.name.replace(/\.\w+$/, '') : words.newKitName[kind];
}

/** The page. */
export class Bench extends LitElement {
  static override properties = {
    desk: { state: true },
    past: { state: true },
    trust: { state: true },
    kits: { state: true },
    failed: { state: true },
    opened: { state: true },
    dropping: { state: true },
    demoLoading: { state: true },
    row: { state: true },
    singleKeys: { state: true },
  };

  declare desk: Desk | undefined;
  declare past: Past | undefined;
  declare trust: Trust | undefined;
  declare kits: BenchKits | undefined;
  declare failed: unknown;
  declare opened: Opened | undefined;
  declare dropping: boolean;
  declare demoLoading: Kind | undefined;
  /** The row that the zoomed note stands in. */
  declare row: [string, string][] | undefined;
  declare singleKeys: boolean;
  #ready: Promise<Desk | undefined> = Promise.resolve(undefined);
  readonly #readers = new Readers();
  readonly #notesIn = new NotesIn(this.#readers, () => this.#askAboutNotes());
  readonly #comparison = new Comparison(() => this.requestUpdate());
  #zoomed: string | undefined;
  #pasted = 0;
  #returnTo: HTMLElement | undefined;

  constructor() {
    super();
    this.dropping = false;
    this.singleKeys = localStorage.getItem(SINGLE_KEYS) !== 'off';
  }

  override connectedCallback(): void {
    super.connectedCallback();
    window.addEventListener('keydown', (event) => this.#onKey(event));
    window.addEventListener('dragover', (event) => this.#onDragOver(event));
    window.addEventListener('dragleave', (event) => {
      if (event.relatedTarget === null) this.dropping = false;
    });
    window.addEventListener('drop', (event) => void this.#onDrop(event));
    window.addEventListener('paste', (event) => this.#onPaste(event));
  }

  override firstUpdated(): void {
    this.#ready = this.#open();
    this.#ready.catch((error: unknown) => (this.failed = error));
  }

  readonly #redraw = (): void => {
    if (this.desk) this.kits?.watch(this.desk);
    this.requestUpdate();
  };

  async #open(): Promise<Desk> {
    const [kits, past] = await Promise.all([BenchKits.open(this.#readers, this.#redraw), Past.open(this.#redraw)]);
    this.kits = kits;
    past?.serve(this.renderRoot, () => this.desk);
    const desk = await this.#lay(kits);
    // Not before: what it offers needs a desk.
    this.past = past;
    return desk;
  }

  async #lay(kits: BenchKits): Promise<Desk> {
    const desk = await kits.lay();
    if (desk.snapshot) localStorage.setItem(HAS_PILE, 'yes');
    else localStorage.removeItem(HAS_PILE);
    this.desk = desk;
    if (this.trust) {
      this.trust.change(desk);
    } else {
      this.trust = new Trust(desk, this.#redraw, () => this.#stated());
      this.trust.serve(this.renderRoot);
    }
    // The photo encoder comes while the person still looks at the page; that of notes only with the first note.
    if (desk.client.kind !== 'notes') setTimeout(() => void desk.client.warm().catch(() => undefined), 300);
    return desk;
  }

  /** Lays another kit on the bench, or with no identity a new one. Resolves to nothing when that fails, which the page then shows. */
  async #changeKit(id?: string): Promise<Desk | undefined> {
    const { kits, desk } = this;
    if (!kits?.kept || id === kits.id) return desk;
    this.#closePanel();
    this.desk = undefined;
    this.failed = undefined;
    this.#shelves?.tiles.clear();
    if (id === undefined) localStorage.removeItem(HAS_PILE);
    else localStorage.setItem(HAS_PILE, 'yes');
    this.#ready = kits.change(desk, id).then(() => this.#lay(kits));
    return this.#ready.catch((error: unknown) => void (this.failed = error));
  }

  get #question(): Question | null {
    return this.renderRoot.querySelector('ken-question');
  }

  get #shelves(): Shelves | null {
    return this.renderRoot.querySelector('ken-shelves');
  }

  async #add({ sources, problems }: Found): Promise<void> {
    // Whoever is faster than the page finds the photos there when it is ready.
    const desk = await this.#ready;
    if (!desk) return;
    for (const problem of problems) desk.complain(problem);
    void this.#openStarters(desk, sources.filter(isStarter));
    const items = sources.filter((source) => !isStarter(source));
    const photos = items.filter((source) => !isNotes(source));
    const notes = items.filter(isNotes);
    if (photos.length > 0) await this.#bring({ kind: 'photos', sources: photos });
    if (notes.length > 0) await this.#bring({ kind: 'notes', sources: notes });
  }

  /** Brings things to the kit on the bench; what is of another kind than the rest there has to go elsewhere. */
  async #bring(coming: Coming, name?: string): Promise<void> {
    const desk = await this.#ready;
    if (!desk) return;
    if ((desk.client.kind ?? coming.kind) !== coming.kind) return this.#openPanel({ panel: 'other-kind', coming });
    localStorage.setItem(HAS_PILE, 'yes');
    void navigator.storage?.persist?.();
    this.kits?.suggest(name ?? nameFor(coming));
    if ('lines' in coming) await this.#notesIn.takeLines(coming.lines, desk);
    else if (coming.kind === 'notes') await this.#notesIn.take(coming.sources, desk);
    else await desk.add(coming.sources);
  }

  async #bringInto(id: string | undefined, coming: Coming): Promise<void> {
    if (this.desk?.client.busy) return this.desk.complain(words.kitBusy);
    if (await this.#changeKit(id)) await this.#bring(coming);
  }

  #askAboutNotes(): void {
    const { step } = this.#notesIn;
    if (step && this.opened?.panel !== 'notes') this.#openPanel({ panel: 'notes' });
    // Without its step the panel goes at once, and with it the event that it was closed.
    if (!step && this.opened?.panel === 'notes') this.#closed();
    this.requestUpdate();
  }

  async #openStarters(desk: Desk, starters: readonly Source[]): Promise<void> {
    if (starters.length === 0) return;
    if (!this.past) return desk.complain(words.notKept);
    this.#openPast();
    await this.past.take(starters, desk);
  }

  #openPast(): void {
    if (this.opened?.panel === 'past' || !this.past) return;
    this.past.hush();
    this.#openPanel({ panel: 'past' });
  }

  #openTrust(): void {
    if (this.opened?.panel === 'trust' || !this.trust) return;
    this.trust.open();
    this.#openPanel({ panel: 'trust' });
  }

  /** Draws a spot check, and shows its items. */
  async #startCheck(): Promise<void> {
    if (await this.trust?.start()) this.#look();
  }

  #look(): void {
    this.opened = { panel: 'spot-check' };
  }

  #stated(): void {
    // The dialog goes without telling that it was closed.
    if (this.opened?.panel === 'spot-check') this.opened = { panel: 'trust' };
  }

  async #learn(): Promise<void> {
    const { desk } = this;
    if (!desk || !this.past) return;
    if (this.opened?.panel === 'start-over') this.#openPast();
    const said = await this.past.learn(desk);
    if (said) desk.said = said;
    this.requestUpdate();
  }

  async #demo(kind: Kind): Promise<void> {
    if (this.demoLoading) return;
    this.demoLoading = kind;
    try {
      const sources = kind === 'photos' ? await demoSources() : [];
      const desk = await this.#ready;
      this.kits?.suggest(words.demoKitName[kind]);
      localStorage.setItem(HAS_PILE, 'yes');
      if (kind === 'photos') await this.#add({ sources, problems: [] });
      else if (desk) await this.#notesIn.takeColumn(demoNotes.source, demoNotes.column, desk);
    } catch (error) {
      await this.#add({ sources: [], problems: [messageOf(error)] });
    } finally {
      this.demoLoading = undefined;
    }
  }

  #choose(what: Kind | 'folder'): void {
    const folder = what === 'folder';
    const input = document.createElement('input');
    input.type = 'file';
    input.multiple = true;
    if (folder) input.webkitdirectory = true;
    else input.accept = what === 'notes' ? '.txt,.csv,.tsv,.tab,.jsonl,.ndjson' : 'image/*';
    input.addEventListener('change', () => void this.#add(fromList(input.files ?? new DataTransfer().files, folder)));
    input.click();
    this.renderRoot.querySelector<HTMLElement>('[popover]')?.hidePopover();
  }

  #onDragOver(event: DragEvent): void {
    if (!event.dataTransfer?.types.includes('Files')) return;
    event.preventDefault();
    this.dropping = true;
  }

  async #onDrop(event: DragEvent): Promise<void> {
    this.dropping = false;
    if (!event.dataTransfer?.types.includes('Files')) return;
    event.preventDefault();
    await this.#add(await fromTransfer(event.dataTransfer));
  }

  #onPaste(event: ClipboardEvent): void {
    if (isTyping(event) || !event.clipboardData || this.opened) return;
    if (event.clipboardData.files.length === 0) {
      const text = event.clipboardData.getData('text/plain');
      if (text.trim() !== '') this.#openPanel({ panel: 'write', text });
      return;
    }
    const sources = fromClipboard(event.clipboardData, this.#pasted);
    this.#pasted += sources.length;
    void this.#add({ sources, problems: [] });
  }

  #onKey(event: KeyboardEvent): void {
    const { desk } = this;
    if (!desk?.snapshot) return;
    if (this.opened) {
      if (this.opened.panel === 'zoom' && event.key.toLowerCase() === 'z') this.#closePanel();
      return;
    }
    const command = commandOf(event, this.singleKeys);
    if (!command) return;
    event.preventDefault();
    // A key that is held down would answer for items nobody has looked at.
    if (event.repeat) return;
    const keyed = this.#shelves?.keyedItem;
    const strip = desk.stripInHand;
    const item = keyed ?? (strip ? this.#question?.stripItem : desk.hand);
    switch (command.do) {
      case 'tray': {
        const tray = desk.snapshot.trays[command.place]?.tray;
        if (tray === undefined) return;
        if (keyed !== undefined) this.#toHand();
        return void (keyed === undefined ? desk.answer(tray) : desk.answer(tray, keyed));
      }
      case 'guess':
        if (strip) void desk.answerStrip();
        else if (desk.guess !== undefined) void desk.answer(desk.guess);
        return;
      case 'find':
        return this.#question?.find();
      case 'none':
        if (keyed !== undefined) this.#toHand();
        return this.#noTray('none', item);
      case 'skip':
        if (keyed !== undefined) this.#toHand();
        return this.#noTray('skip', item);
      case 'undo':
        return void desk.undo();
      case 'redo':
        return void desk.redo();
      case 'zoom':
        return void this.#zoom(item);
      case 'back':
        return desk.backToQuestion();
      case 'remove':
        if (keyed !== undefined) this.#shelves?.holdPlace();
        return void desk.removeItem(item);
      case 'shelves':
        return strip ? this.#question?.enterStrip() : this.#shelves?.resume();
      case 'strips':
        return this.#otherWay();
      case 'past':
        return this.#openPast();
      case 'trust':
        return this.#openTrust();
      case 'kits':
        return this.#openKits();
      case 'help':
        return this.#openPanel({ panel: 'help' });
    }
  }

  #openKits(): void {
    if (this.opened?.panel !== 'kits') this.#openPanel({ panel: 'kits' });
  }

  /** From single questions to strips and back. */
  #otherWay(): void {
    const { desk } = this;
    if (desk?.stripInHand) void desk.offerStrips(false);
    else if (desk && desk.stripInstead > 0) void desk.offerStrips(true);
  }

  /** In a strip, these are about the one item that keys or a tap led to. */
  #noTray(way: 'none' | 'skip', item: number | undefined): void {
    const { desk } = this;
    if (item === undefined && desk?.stripInHand) desk.say(words.stripNone);
    else void desk?.[way](item);
  }

  /** Keys act on the item in hand again. */
  #toHand(): void {
    this.#shelves?.release();
    this.#question?.settle();
  }

  async #zoom(item = this.desk?.hand): Promise<void> {
    const { desk } = this;
    if (!desk || item === undefined) return;
    const of = desk.items[item];
    if (of && 'text' in of) {
      this.row = undefined;
      this.#openPanel({ panel: 'zoom', item });
      this.row = await desk.client.rowOf(item).catch(() => []);
      return;
    }
    const picture = (await desk.client.original(item)) ?? of?.thumbnail;
    this.#zoomed = picture && URL.createObjectURL(picture);
    this.#openPanel({ panel: 'zoom', item });
  }

  #openPanel(opened: Opened): void {
    this.renderRoot.querySelector<HTMLElement>('[popover]')?.hidePopover();
    const active = (this.renderRoot as ShadowRoot).activeElement;
    this.#returnTo = active instanceof HTMLElement ? active : undefined;
    this.opened = opened;
  }

  #closePanel(): void {
    this.renderRoot.querySelector<Panel>('.panel')?.close();
    // The panel tells it too, unless it is gone from the page by then.
    this.#closed();
  }

  #closed(): void {
    if (!this.opened) return;
    if (this.opened?.panel === 'notes') this.#notesIn.settle(false);
    this.opened = undefined;
    if (this.#zoomed) URL.revokeObjectURL(this.#zoomed);
    this.#zoomed = undefined;
    this.#returnTo?.focus();
    // The browser gives the focus back to a tile; after a click that is not where keys should act.
    if (this.#shelves?.matches(':focus-within') && this.#shelves.keyedItem === undefined) this.#toHand();
  }

  async #changeTray(change: Promise<string | undefined> | undefined): Promise<void> {
    const problem = await change;
    if (problem === undefined) return this.#closePanel();
    this.desk?.dismiss(problem);
    if (this.opened?.panel === 'tray') this.opened = { ...this.opened, error: problem };
  }

  #compare(): void {
    const { desk } = this;
    if (!desk) return;
    this.#openPanel({ panel: 'compare' });
    if (!this.#comparison.view(desk).found) void this.#comparison.work(desk);
  }

  async #takeResult(): Promise<void> {
    const { desk } = this;
    if (!desk) return;
    try {
      desk.said = words.resultTaken(await handOver(desk));
    } catch (error) {
      return desk.complain(messageOf(error));
    }
    this.past?.finish(desk.snapshot);
    this.#comparison.finish(desk);
    this.requestUpdate();
  }

  #listeners(root: ShadowRoot): void {
    const on = <T>(type: string, act: (detail: T) => void) =>
      root.addEventListener(type, (event) => act((event as CustomEvent<T>).detail));
    on('demo', () => void this.#demo('photos'));
    on('demo-notes', () => void this.#demo('notes'));
    on('choose-files', () => this.#choose('photos'));
    on('choose-notes', () => this.#choose('notes'));
    on('choose-folder', () => this.#choose('folder'));
    on('write-notes', () => this.#openPanel({ panel: 'write', text: '' }));
    on<{ text: string }>('written', ({ text }) => void this.#bring({ kind: 'notes', lines: text }));
    on<{ column?: number; each?: boolean }>('notes-choose', (change) => this.#notesIn.choose(change));
    on('notes-settle', () => this.#notesIn.settle(true));
    on<{ id: string }>('open-kit', ({ id }) => void this.#changeKit(id));
    on('new-kit', () => void this.#changeKit());
    on<{ id: string; name: string }>('rename-kit', ({ id, name }) => void this.kits?.rename(id, name));
    on<{ id: string }>('delete-kit', ({ id }) => void this.#deleteKit(id));
    on<{ id?: string }>('into-kit', ({ id }) => {
      if (this.opened?.panel !== 'other-kind') return;
      const { coming } = this.opened;
      this.#closePanel();
      void this.#bringInto(id, coming);
    });
    on('camera', () => this.#openPanel({ panel: 'camera' }));
    on<{ sources: Source[] }>('pictures', ({ sources }) => void this.#add({ sources, problems: [] }));
    on<{ tray: number }>('answer', ({ tray }) => void this.desk?.answer(tray));
    on<{ name: string }>('answer-new', ({ name }) => void this.desk?.answerNew(name));
    on<{ item: number; tray: number }>('place', ({ item, tray }) => {
      this.#toHand();
      void (tray < 0 ? this.desk?.none(item) : this.desk?.answer(tray, item));
    });
    const inHand = () => (this.desk?.stripInHand ? this.#question?.stripItem : this.desk?.hand);
    on('none', () => this.#noTray('none', inHand()));
    on('skip', () => this.#noTray('skip', inHand()));
    on('confirm-strip', () => void this.desk?.answerStrip());
    on<{ item: number }>('toggle-strip', ({ item }) => this.desk?.toggle(item));
    on('strips', () => this.#otherWay());
    on('withdraw', () => void this.desk?.withdraw());
    on('back', () => this.desk?.backToQuestion());
    on('zoom', () => void this.#zoom());
    on<{ item: number }>('take', ({ item }) => this.#take(item));
    on('stop', () => this.desk?.stop());
    on('go-on', () => void this.desk?.goOn());
    on<{ problem: string }>('dismiss', ({ problem }) => this.desk?.dismiss(problem));
    on('dismiss-outcome', () => this.desk?.dismissOutcome());
    on('closed', () => this.#closed());
    on<{ on: boolean }>('single-keys', ({ on: keysOn }) => {
      this.singleKeys = keysOn;
      localStorage.setItem(SINGLE_KEYS, keysOn ? 'on' : 'off');
    });
    on<{ tray: number }>('tray-menu', ({ tray }) => this.#openPanel({ panel: 'tray', tray }));
    on<{ tray: number; name: string }>('rename-tray', ({ tray, name }) => void this.#changeTray(this.desk?.renameTray(tray, name)));
    on<{ from: number; into: number }>('merge-trays', ({ from, into }) => void this.#changeTray(this.desk?.mergeTrays(from, into)));
    on<{ tray: number }>('remove-tray', ({ tray }) => void this.#changeTray(this.desk?.removeTray(tray)));
    on('clear', () => void this.#clear());
    on('compare', () => this.#compare());
    on('work-compare', () => this.desk && void this.#comparison.work(this.desk));
    on('stop-compare', () => this.#comparison.stop());
    on('past', () => this.#openPast());
    on('learn', () => void this.#learn());
    on('trust', () => this.#openTrust());
    on('start-check', () => void this.#startCheck());
    on('look', () => this.#look());
    on<{ item: number }>('take-out', ({ item }) => {
      this.#closePanel();
      this.#take(item);
    });
  }

  protected override createRenderRoot(): HTMLElement | DocumentFragment {
    const root = super.createRenderRoot();
    this.#listeners(root as ShadowRoot);
    return root;
  }

  #take(item: number): void {
    this.desk?.take(item);
    this.#toHand();
    const calm = matchMedia('(prefers-reduced-motion: reduce)').matches;
    this.renderRoot.querySelector('.hand')?.scrollIntoView({ block: 'nearest', behavior: calm ? 'auto' : 'smooth' });
  }

  async #clear(): Promise<void> {
    this.#closePanel();
    this.#shelves?.tiles.clear();
    this.trust?.forget();
    localStorage.removeItem(HAS_PILE);
    await this.desk?.clear();
    await this.kits?.forget();
  }

  async #deleteKit(id: string): Promise<void> {
    const { kits, desk } = this;
    if (!kits) return;
    if (id === kits.id) return this.#clear();
    const name = kits.list.find((kit) => kit.id === id)?.name ?? '';
    try {
      await kits.delete(id);
      if (desk) desk.said = words.kitDeleted(name);
    } catch (error) {
      desk?.complain(messageOf(error));
    }
    this.requestUpdate();
  }

  async #discard(): Promise<void> {
    localStorage.removeItem(HAS_PILE);
    const { kits } = this;
    await PileClient.discard(kits?.id);
    await kits?.forget();
    location.reload();
  }

  override updated(): void {
    const kit = this.desk?.snapshot && this.kits?.nameOf(this.desk);
    document.title = words.title(kit);
  }

  override render(): TemplateResult {
    if (this.failed !== undefined) return this.#failure();
    const { desk } = this;
    const bench = desk?.snapshot !== undefined && (desk.view?.tally.items ?? 0) > 0;
    return html`
      ${this.#top(bench)}
      ${desk
        ? html`<ken-reading .kind=${desk.kind} .progress=${desk.progress} .fetched=${desk.fetched} .problems=${desk.problems} ?stopping=${desk.stopping}></ken-reading>`
        : nothing}
      ${bench ? this.#bench(desk) : this.#welcome()}
      <footer>
        <p>${words.caution}</p>
        <p class="row">
          <strong>${words.private}</strong>
          <button class="plain" @click=${() => this.#openPanel({ panel: 'help' })}>${words.helpTitle}</button>
          ${bench && this.trust ? html`<button class="plain" @click=${() => this.#openTrust()}>${words.trust.open}</button>` : nothing}
          <button class="plain" @click=${() => this.#openKits()}>${words.kits}</button>
          ${this.past ? html`<button class="plain" @click=${() => this.#openPast()}>${words.past}</button>` : nothing}
          ${bench ? html`<button class="plain" @click=${() => this.#compare()}>${words.compare}</button>` : nothing}
          ${bench
            ? html`<button class="plain" @click=${() => this.#openPanel({ panel: 'start-over' })}>${words.startOver}</button>`
            : nothing}
        </p>
      </footer>
      <p class="visually-hidden" role="status">${desk?.said ?? ''}</p>
      ${this.dropping ? html`<div class="dropping">${words.dropNow}</div>` : nothing} ${this.#panel()}
    `;
  }

  #top(bench: boolean): TemplateResult {
    const { desk } = this;
    return html`<header class=${bench ? 'working' : ''}>
      ${bench ? html`<h1 class="brand">${brand}</h1>` : html`<p class="brand">${brand}</p>`}
      ${bench && desk ? this.#standing(desk) : html`<span></span>`}
      <nav aria-label="Pile">
        ${desk && (bench || desk.snapshot?.canUndo || desk.snapshot?.canRedo)
          ? html`<button ?disabled=${!desk.snapshot?.canUndo} @click=${() => void desk.undo()}>${words.undo}</button>
              <button ?disabled=${!desk.snapshot?.canRedo} @click=${() => void desk.redo()}>${words.redo}</button>`
          : nothing}
        ${bench
          ? html`<button popovertarget="ways">${words.add[desk?.kind ?? 'photos'][0]}<span class="wide">${words.add[desk?.kind ?? 'photos'][1]}</span></button>
              <button class="strong" @click=${() => void this.#takeResult()}><span class="wide">${words.result[0]}</span><span class="narrow">${words.result[1]}</span></button>`
          : nothing}
        <button class="about" aria-label=${words.help} title=${words.help} @click=${() => this.#openPanel({ panel: 'help' })}>?</button>
      </nav>
      ${bench
        ? html`<div id="ways" popover class="ways">
              ${desk?.kind === 'notes' ? this.#waysOfNotes() : this.#waysOfPhotos()}
              <button class="plain" @click=${() => this.#openKits()}>${words.newKit}</button>
              <p class="soft">${words.dropHint}</p>
            </div>`
        : nothing}
    </header>`;
  }

  #waysOfPhotos(): TemplateResult {
    return html`<button class="plain" @click=${() => this.#choose('photos')}>${words.chooseFiles}</button>
      <button class="plain" @click=${() => this.#choose('folder')}>${words.chooseFolder}</button>
      ${hasCamera() ? html`<button class="plain" @click=${() => this.#openPanel({ panel: 'camera' })}>${words.camera}</button>` : nothing}`;
  }

  #waysOfNotes(): TemplateResult {
    return html`<button class="plain" @click=${() => this.#choose('notes')}>${words.chooseNotes}</button>
      <button class="plain" @click=${() => this.#openPanel({ panel: 'write', text: '' })}>${words.writeNotes}</button>`;
  }

  /** How the pile stands. */
  #standing({ view, snapshot, kind }: Desk): TemplateResult {
    return html`<div class="pile">
      <ken-band .tally=${view?.tally} .kind=${kind}></ken-band>
      <ken-outlook .outlook=${snapshot?.outlook} ?open=${snapshot?.question !== undefined}></ken-outlook>
    </div>`;
  }

  #welcome(): TemplateResult {
    if (!this.desk && localStorage.getItem(HAS_PILE)) return html`<main class="failure"><p>${words.opening}</p></main>`;
    return html`<ken-welcome .loading=${this.demoLoading} ?hasCamera=${hasCamera()} .kits=${this.kits?.others ?? []}>${this.#starterLine()}</ken-welcome>`;
  }

  #starterLine(): TemplateResult | typeof nothing {
    if (!this.past) return nothing;
    return html`<ken-starter-line .view=${this.past.view(this.desk?.snapshot)}></ken-starter-line>`;
  }

  /** Offered when the person looks up from the bench anyway. */
  #comparisonLine(desk: Desk): TemplateResult | typeof nothing {
    if (!this.#comparison.view(desk).offered) return nothing;
    return html`<p class="offer">
      ${words.compareOffer} <button class="plain" @click=${() => this.#compare()}>${words.compare}</button>
    </p>`;
  }

  #bench(desk: Desk): TemplateResult {
    const strip = desk.stripInHand;
    return html`<main>
      <div class="hand">
        <ken-question
          .item=${desk.handItem}
          .picture=${desk.hand === undefined ? undefined : this.#picture(desk, desk.hand)}
          .trays=${desk.snapshot?.trays ?? []}
          .ranking=${desk.ranking}
          .guess=${desk.guess}
          .plausible=${desk.plausible}
          .setAside=${desk.setAside}
          .given=${desk.given}
          .status=${desk.handStatus}
          ?outOfTurn=${desk.outOfTurn}
          .strip=${strip}
          .stripItems=${strip?.items.flatMap((item) => desk.items[item] ?? []) ?? []}
          .stripOut=${strip?.out ?? NONE}
          .stripInstead=${desk.stripInstead}
          ?busy=${strip?.ready === false}
        ></ken-question>
        <p class="said" aria-hidden="true">${desk.said}</p>
      </div>
      <div class="side">
        ${this.#starterLine()} ${this.#comparisonLine(desk)}
        <ken-trust-line .known=${this.trust?.line()} .check=${desk.snapshot?.check}></ken-trust-line>
        <ken-shelves
          .view=${desk.view}
          .snapshot=${desk.snapshot}
          .items=${desk.items}
          .hand=${desk.hand}
          .movedItems=${desk.movedItems}
        ></ken-shelves>
      </div>
    </main>`;
  }

  #pictureOf: { item: number; url: string | undefined } = { item: -1, url: undefined };

  #picture(desk: Desk, item: number): string | undefined {
    if (this.#pictureOf.item !== item) {
      if (this.#pictureOf.url) URL.revokeObjectURL(this.#pictureOf.url);
      const of = desk.items[item];
      const blob = of && 'thumbnail' in of ? of.thumbnail : undefined;
      this.#pictureOf = { item, url: blob && URL.createObjectURL(blob) };
    }
    return this.#pictureOf.url;
  }

  #panel(): TemplateResult | typeof nothing {
    const { desk, opened } = this;
    if (opened?.panel === 'help') return html`<ken-help class="panel" ?singleKeys=${this.singleKeys}></ken-help>`;
    if (opened?.panel === 'camera') return html`<ken-camera class="panel"></ken-camera>`;
    if (opened?.panel === 'past') {
      return this.past ? html`<ken-past-panel class="panel" .view=${this.past.view(desk?.snapshot)}></ken-past-panel>` : nothing;
    }
    if (opened?.panel === 'write') return html`<ken-write class="panel" .text=${opened.text}></ken-write>`;
    if (opened?.panel === 'notes') {
      return this.#notesIn.step ? html`<ken-notes-panel class="panel" .step=${this.#notesIn.step}></ken-notes-panel>` : nothing;
    }
    if (opened?.panel === 'kits') return this.#kitsPanel();
    if (!opened || !desk) return nothing;
    switch (opened.panel) {
      case 'trust': {
        const view = this.trust?.view();
        if (!view) return nothing;
        return html`<ken-trust-panel class="panel" .view=${view} .items=${desk.items} .pictureOf=${this.#pictureOfItem} ?singleKeys=${this.singleKeys}></ken-trust-panel>`;
      }
      case 'spot-check': {
        const { snapshot } = desk;
        if (!snapshot?.check) return nothing;
        return html`<ken-spot-check
          class="panel"
          .check=${snapshot.check}
          .snapshot=${snapshot}
          .items=${desk.items}
          .pictureOf=${this.#pictureOfItem}
          .originalOf=${this.#originalOfItem}
          .problem=${this.trust?.problem ?? ''}
          ?singleKeys=${this.singleKeys}
        ></ken-spot-check>`;
      }
      case 'compare':
        return html`<ken-comparison class="panel" .view=${this.#comparison.view(desk)}></ken-comparison>`;
      case 'other-kind': {
        const { coming } = opened;
        return html`<ken-other-kind
          class="panel"
          .kind=${coming.kind}
          .files=${'lines' in coming ? 1 : coming.sources.length}
          .kit=${this.kits?.nameOf(desk) ?? ''}
          .kits=${this.kits?.others.filter(({ encoder }) => kindOf(encoder) === coming.kind) ?? []}
          .kept=${this.kits?.kept ?? false}
        ></ken-other-kind>`;
      }
      case 'zoom': {
        const of = desk.items[opened.item];
        if (of && 'text' in of) return html`<ken-note class="panel" .text=${of.text} .name=${of.name} .row=${this.row}></ken-note>`;
        return html`<ken-zoom class="panel" .picture=${this.#zoomed} .name=${of?.name ?? ''}></ken-zoom>`;
      }
      case 'start-over': {
        const loss = words.startOverLoss(desk.kind, desk.view?.tally.items ?? 0, desk.snapshot?.trays.length ?? 0, desk.answers);
        const pile = this.past?.view(desk.snapshot).pile;
        const canTeach = pile?.teachable === true && pile.taught?.items !== pile.answers;
        return html`<ken-start-over class="panel" loss=${loss} ?canTeach=${canTeach}></ken-start-over>`;
      }
      case 'tray': {
        const tray = desk.snapshot?.trays.find((one) => one.tray === opened.tray);
        if (!tray) return nothing;
        const others = desk.snapshot?.trays.filter((one) => one !== tray) ?? [];
        return html`<ken-tray-panel class="panel" .tray=${tray} .others=${others} error=${opened.error ?? nothing}></ken-tray-panel>`;
      }
    }
  }

  readonly #pictureOfItem = (item: number): string | undefined => this.#shelves?.tiles.url(item);

  readonly #originalOfItem = async (item: number): Promise<Blob | undefined> => this.desk?.client.original(item);

  #kitsPanel(): TemplateResult {
    const { kits, desk } = this;
    const busy = desk?.progress?.state === 'reading' ? 'reading' : desk?.client.busy ? 'rest' : undefined;
    return html`<ken-kits
      class="panel"
      .kits=${kits?.list ?? []}
      .current=${desk?.snapshot ? kits?.id : ''}
      .busy=${busy}
      .kept=${kits?.kept ?? false}
    ></ken-kits>`;
  }

  #failure(): TemplateResult {
    const code = this.failed instanceof KenspeckleError ? this.failed.code : (this.failed as { code?: string }).code;
    return html`${this.#top(false)}
      <main class="failure" role="alert">
        <h1>${words.cantStart}</h1>
        <p>${messageOf(this.failed)}</p>
        <p class="row">
          <button class="strong" @click=${() => location.reload()}>${words.reload}</button>
          ${code?.startsWith('state-') ? html`<button class="alarm" @click=${() => void this.#discard()}>${words.discard}</button>` : nothing}
        </p>
        ${this.kits && code === 'pile-open-elsewhere'
          ? html`<ken-kit-list .kits=${this.kits.others}></ken-kit-list>
              <p><button @click=${() => void this.#changeKit()}>${words.newKit}</button></p>`
          : nothing}
      </main>`;
  }

  static override styles = [shared, appStyles];
}

customElements.define('ken-bench', Bench);
