import { html, LitElement, nothing, type TemplateResult } from 'lit';
import { KenspeckleError, messageOf, PileClient, type Source } from '../kit/client';
import './band';
import { hasCamera } from './camera';
import { Desk } from './desk';
import { demoSources, type Found, fromClipboard, fromList, fromTransfer } from './files';
import { commandOf, isTyping } from './keys';
import { appStyles } from './app-styles';
import { type Panel } from './panels';
import './panels';
import type { Question } from './question';
import './question';
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

type Opened = { panel: 'help' | 'start-over' | 'camera' | 'past' | 'trust' | 'spot-check' } | { panel: 'zoom'; item: number } | { panel: 'tray'; tray: number; error?: string };

const SINGLE_KEYS = 'single-keys';
/** Whether to expect a pile before the store is open: the empty page would flash up otherwise. */
const HAS_PILE = 'has-pile';

const brand = html`<svg viewBox="0 0 64 64" aria-hidden="true"><rect x="11" y="12" width="11" height="11" rx="2"/><rect x="26.500" y="12" width="11" height="11" rx="2"/><rect x="42" y="12" width="11" height="11" rx="2"/><rect class="bright" x="21" y="27" width="22" height="22" rx="3"/><rect x="9" y="50.500" width="46" height="5" rx="2"/></svg>
  <span>${words.brand}</span>`;

/** The page. */
export class Bench extends LitElement {
  static override properties = {
    desk: { state: true },
    past: { state: true },
    trust: { state: true },
    failed: { state: true },
    opened: { state: true },
    dropping: { state: true },
    demoLoading: { state: true },
    singleKeys: { state: true },
  };

  declare desk: Desk | undefined;
  declare past: Past | undefined;
  declare trust: Trust | undefined;
  declare failed: unknown;
  declare opened: Opened | undefined;
  declare dropping: boolean;
  declare demoLoading: boolean;
  declare singleKeys: boolean;
  #ready: Promise<Desk | undefined> = Promise.resolve(undefined);
  #zoomed: string | undefined;
  #pasted = 0;
  #returnTo: HTMLElement | undefined;

  constructor() {
    super();
    this.dropping = false;
    this.demoLoading = false;
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

  async #open(): Promise<Desk> {
    const client = await PileClient.open();
    const redraw = () => this.requestUpdate();
    const [desk, past] = await Promise.all([Desk.lay(client, redraw), Past.open(redraw)]);
    past?.serve(this.renderRoot, desk);
    this.trust = new Trust(desk, redraw, () => this.#stated());
    this.trust.serve(this.renderRoot);
    this.past = past;
    this.desk = desk;
    // The encoder comes while the person still looks at the page.
    setTimeout(() => void client.warm().catch(() => undefined), 300);
    return desk;
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
    const photos = sources.filter((source) => !isStarter(source));
    if (photos.length === 0) return;
    localStorage.setItem(HAS_PILE, 'yes');
    void navigator.storage?.persist?.();
    await desk.add(photos);
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

  async #demo(): Promise<void> {
    if (this.demoLoading) return;
    this.demoLoading = true;
    try {
      await this.#add({ sources: await demoSources(), problems: [] });
    } catch (error) {
      await this.#add({ sources: [], problems: [messageOf(error)] });
    } finally {
      this.demoLoading = false;
    }
  }

  #choose(folder: boolean): void {
    const input = document.createElement('input');
    input.type = 'file';
    input.multiple = true;
    if (folder) input.webkitdirectory = true;
    else input.accept = 'image/*';
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
    if (isTyping(event) || !event.clipboardData || event.clipboardData.files.length === 0) return;
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
    const item = keyed ?? desk.hand;
    switch (command.do) {
      case 'tray': {
        const tray = desk.snapshot.trays[command.place]?.tray;
        if (tray === undefined) return;
        if (keyed !== undefined) this.#toHand();
        return void desk.answer(tray, item);
      }
      case 'guess':
        if (desk.guess !== undefined) void desk.answer(desk.guess);
        return;
      case 'find':
        return this.#question?.find();
      case 'none':
        if (keyed !== undefined) this.#toHand();
        return void desk.none(item);
      case 'skip':
        if (keyed !== undefined) this.#toHand();
        return void desk.skip(item);
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
        return this.#shelves?.resume();
      case 'past':
        return this.#openPast();
      case 'trust':
        return this.#openTrust();
      case 'help':
        return this.#openPanel({ panel: 'help' });
    }
  }

  /** Keys act on the item in hand again. */
  #toHand(): void {
    this.#shelves?.release();
    this.#question?.settle();
  }

  async #zoom(item = this.desk?.hand): Promise<void> {
    const { desk } = this;
    if (!desk || item === undefined) return;
    const picture = (await desk.client.original(item)) ?? desk.items[item]?.thumbnail;
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
    const panel = this.renderRoot.querySelector<Panel>('.panel');
    if (panel) panel.close();
    else this.#closed();
  }

  #closed(): void {
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

  #takeResult(): void {
    const { desk } = this;
    if (!desk) return;
    desk.said = words.resultTaken(handOver(desk));
    this.past?.finish(desk.snapshot);
    this.requestUpdate();
  }

  #listeners(root: ShadowRoot): void {
    const on = <T>(type: string, act: (detail: T) => void) =>
      root.addEventListener(type, (event) => act((event as CustomEvent<T>).detail));
    on('demo', () => void this.#demo());
    on('choose-files', () => this.#choose(false));
    on('choose-folder', () => this.#choose(true));
    on('camera', () => this.#openPanel({ panel: 'camera' }));
    on<{ sources: Source[] }>('pictures', ({ sources }) => void this.#add({ sources, problems: [] }));
    on<{ tray: number }>('answer', ({ tray }) => void this.desk?.answer(tray));
    on<{ name: string }>('answer-new', ({ name }) => void this.desk?.answerNew(name));
    on<{ item: number; tray: number }>('place', ({ item, tray }) => {
      this.#toHand();
      void (tray < 0 ? this.desk?.none(item) : this.desk?.answer(tray, item));
    });
    on('none', () => void this.desk?.none());
    on('skip', () => void this.desk?.skip());
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
  }

  async #discard(): Promise<void> {
    localStorage.removeItem(HAS_PILE);
    await PileClient.discard();
    location.reload();
  }

  override render(): TemplateResult {
    if (this.failed !== undefined) return this.#failure();
    const { desk } = this;
    const bench = desk?.snapshot !== undefined && (desk.view?.tally.items ?? 0) > 0;
    return html`
      ${this.#top(bench)}
      ${desk
        ? html`<ken-reading .progress=${desk.progress} .problems=${desk.problems} ?stopping=${desk.stopping}></ken-reading>`
        : nothing}
      ${bench ? this.#bench(desk) : this.#welcome()}
      <footer>
        <p>${words.caution}</p>
        <p class="row">
          <strong>${words.private}</strong>
          <button class="plain" @click=${() => this.#openPanel({ panel: 'help' })}>${words.helpTitle}</button>
          ${bench && this.trust ? html`<button class="plain" @click=${() => this.#openTrust()}>${words.trust.open}</button>` : nothing}
          ${this.past ? html`<button class="plain" @click=${() => this.#openPast()}>${words.past}</button>` : nothing}
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
      ${bench && desk ? html`<ken-band .tally=${desk.view?.tally}></ken-band>` : html`<span></span>`}
      <nav aria-label="Pile">
        ${desk && (bench || desk.snapshot?.canUndo || desk.snapshot?.canRedo)
          ? html`<button ?disabled=${!desk.snapshot?.canUndo} @click=${() => void desk.undo()}>${words.undo}</button>
              <button ?disabled=${!desk.snapshot?.canRedo} @click=${() => void desk.redo()}>${words.redo}</button>`
          : nothing}
        ${bench
          ? html`<button popovertarget="ways">${words.add[0]}<span class="wide">${words.add[1]}</span></button>
              <button class="strong" @click=${() => this.#takeResult()}><span class="wide">${words.result[0]}</span><span class="narrow">${words.result[1]}</span></button>`
          : nothing}
        <button class="about" aria-label=${words.help} title=${words.help} @click=${() => this.#openPanel({ panel: 'help' })}>?</button>
      </nav>
      ${bench
        ? html`<div id="ways" popover class="ways">
              <button class="plain" @click=${() => this.#choose(false)}>${words.chooseFiles}</button>
              <button class="plain" @click=${() => this.#choose(true)}>${words.chooseFolder}</button>
              ${hasCamera()
                ? html`<button class="plain" @click=${() => this.#openPanel({ panel: 'camera' })}>${words.camera}</button>`
                : nothing}
              <p class="soft">${words.dropHint}</p>
            </div>`
        : nothing}
    </header>`;
  }

  #welcome(): TemplateResult {
    if (!this.desk && localStorage.getItem(HAS_PILE)) return html`<main class="failure"><p>${words.opening}</p></main>`;
    return html`<ken-welcome ?loading=${this.demoLoading} ?hasCamera=${hasCamera()}>${this.#starterLine()}</ken-welcome>`;
  }

  #starterLine(): TemplateResult | typeof nothing {
    if (!this.past) return nothing;
    return html`<ken-starter-line .view=${this.past.view(this.desk?.snapshot)}></ken-starter-line>`;
  }

  #bench(desk: Desk): TemplateResult {
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
        ></ken-question>
        <p class="said" aria-hidden="true">${desk.said}</p>
      </div>
      <div class="side">
        ${this.#starterLine()}
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
      const blob = desk.items[item]?.thumbnail;
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
      case 'zoom':
        return html`<ken-zoom class="panel" .picture=${this.#zoomed} .name=${desk.items[opened.item]?.name ?? ''}></ken-zoom>`;
      case 'start-over': {
        const loss = words.startOverLoss(desk.view?.tally.items ?? 0, desk.snapshot?.trays.length ?? 0, desk.answers);
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
      </main>`;
  }

  static override styles = [shared, appStyles];
}

customElements.define('ken-bench', Bench);
