import { css, html, LitElement, nothing, type PropertyValues, type TemplateResult } from 'lit';
import { repeat } from 'lit/directives/repeat.js';
import { type Item, kindOf, type Snapshot } from '../kit/client';
import { ITEM_TYPE, tell, trayKey } from './event';
import { shared } from './styles';
import { Tiles } from './tiles';
import type { BenchView, ShelfView } from './view';
import { count, words } from './words';

const PILE = -1;
const ASIDE = -2;

/** Rows shown of a folded shelf; what one part does not need the other may use. */
const BACK_ROWS = 2;
const FRONT_ROWS = 1;
const PILE_ROWS = 6;
/** The same for notes, whose rows are lines. */
const NOTE_BACK_ROWS = 4;
const NOTE_FRONT_ROWS = 3;
const NOTE_PILE_ROWS = 12;
const NOTE_WIDTH = 290;
/** Items that an unfolded shelf shows more with every frame: hundreds at once would make the page stand still. */
const UNFOLD = 120;
/** In pixels, as in the style sheet below. */
const GAP = 5;
const SHELF_GAP = 20;
const SHELF_LEAST = 330;
const SHELF_PADDING = 24;

interface Drawn {
  tray: number;
  name: string;
  place: number;
  note: string;
  back: number[];
  front: number[];
}

/** The trays as shelves: sure items small at the back, unsure ones large at the front edge. */
export class Shelves extends LitElement {
  static override properties = {
    view: { attribute: false },
    snapshot: { attribute: false },
    items: { attribute: false },
    hand: { attribute: false },
    movedItems: { attribute: false },
    open: { state: true },
    unfolded: { state: true },
    width: { state: true },
    over: { state: true },
  };

  declare view: BenchView | undefined;
  declare snapshot: Snapshot | undefined;
  declare items: readonly Item[];
  declare hand: number | undefined;
  declare movedItems: ReadonlySet<number>;
  declare open: number | undefined;
  /** How many of a part the open shelf shows so far. */
  declare unfolded: number;
  declare width: number;
  declare over: number | undefined;

  readonly tiles = new Tiles();
  #focused: number | undefined;
  /** Whether the focus came to the tile by keys; only then do keys act on it. */
  #keyed = false;
  #pointing = false;
  readonly #resize = new ResizeObserver(() => this.#measure());

  constructor() {
    super();
    this.items = [];
    this.movedItems = new Set();
    this.unfolded = 0;
    this.width = 0;
  }

  override connectedCallback(): void {
    super.connectedCallback();
    this.#resize.observe(this);
    window.addEventListener('pointerdown', this.#onPointer, true);
    window.addEventListener('keydown', this.#onAnyKey, true);
  }

  override disconnectedCallback(): void {
    super.disconnectedCallback();
    this.#resize.disconnect();
    window.removeEventListener('pointerdown', this.#onPointer, true);
    window.removeEventListener('keydown', this.#onAnyKey, true);
  }

  readonly #onPointer = (): void => {
    this.#pointing = true;
    this.#keyed = false;
  };

  readonly #onAnyKey = (): void => {
    this.#pointing = false;
  };

  /** The item that keys act on instead of the one in hand: the tile the focus was brought to by keys. */
  get keyedItem(): number | undefined {
    return this.#keyed ? this.#focusedItem : undefined;
  }

  /** From now on keys act on the item in hand, until an arrow or Tab leads to a tile again. */
  release(): void {
    this.#keyed = false;
  }

  /** Leads the focus back to the tile it was on last. */
  resume(): void {
    const last = this.renderRoot.querySelector<HTMLElement>(`[data-item='${this.#focused}']`);
    const tile = last ?? this.renderRoot.querySelector<HTMLElement>('[data-item]');
    if (tile) this.#focus(tile);
  }

  get #focusedItem(): number | undefined {
    const active = (this.renderRoot as ShadowRoot).activeElement;
    return active instanceof HTMLElement && active.dataset['item'] !== undefined ? Number(active.dataset['item']) : undefined;
  }

  /** After the focused item went elsewhere, the focus goes to the one that took its place. */
  holdPlace(): void {
    const element = (this.renderRoot as ShadowRoot).activeElement;
    const row = element?.parentElement;
    if (!element || !row) return;
    const index = [...row.children].indexOf(element);
    void this.updateComplete.then(async () => {
      await this.updateComplete;
      const next = row.children[Math.min(index, row.children.length - 1)];
      if (next instanceof HTMLElement) this.#focus(next);
    });
  }

  #measure(): void {
    if (this.clientWidth > 0 && this.clientWidth !== this.width) this.width = this.clientWidth;
  }

  /** Of the room for pictures on a shelf. */
  #room(wide: boolean): number {
    const abreast = wide ? 1 : Math.max(1, Math.floor((this.width + SHELF_GAP) / (SHELF_LEAST + SHELF_GAP)));
    return (this.width + SHELF_GAP) / abreast - SHELF_GAP - SHELF_PADDING;
  }

  #style(name: string): number {
    return Number.parseFloat(getComputedStyle(this).getPropertyValue(name)) || 44;
  }

  #columns(side: number, width: number): number {
    return Math.max(1, Math.floor((width + GAP) / (side + GAP)));
  }

  #drawn(): Drawn[] {
    const { view } = this;
    if (!view) return [];
    const drawn: Drawn[] = [];
    if (view.pile.length > 0) {
      drawn.push({ tray: PILE, name: words.pile, place: -1, note: words.pileHint, back: view.pile, front: [] });
    }
    for (const shelf of view.shelves) drawn.push({ ...shelf, note: '' } satisfies ShelfView & Drawn);
    if (view.aside.length + view.asideBySorter.length > 0) {
      drawn.push({ tray: ASIDE, name: words.aside, place: -1, note: words.asideHint, back: view.aside, front: view.asideBySorter });
    }
    return drawn;
  }

  override render(): TemplateResult {
    return html`<h2 class="visually-hidden">${words.shelves}</h2>
      <div class="shelves ${this.#notes ? 'notes' : ''}" @keydown=${this.#onKey} @click=${this.#onClick} @focusin=${this.#onFocus}>
        ${repeat(
          this.#drawn(),
          ({ tray }) => tray,
          (shelf) => this.#shelf(shelf),
        )}
      </div>`;
  }

  get #notes(): boolean {
    return this.snapshot !== undefined && kindOf(this.snapshot.encoder) === 'notes';
  }

  #noteLimits(shelf: Drawn): { back: number; front: number } {
    const columns = this.#columns(NOTE_WIDTH, this.#room(shelf.tray === PILE));
    if (shelf.tray === PILE) return { back: columns * NOTE_PILE_ROWS, front: 0 };
    if (shelf.front.length === 0) return { back: columns * 2 * NOTE_BACK_ROWS, front: 0 };
    const spare = Math.max(0, NOTE_BACK_ROWS - Math.ceil(shelf.back.length / columns));
    return { back: columns * NOTE_BACK_ROWS, front: columns * (NOTE_FRONT_ROWS + Math.floor(spare / 2)) };
  }

  #limits(shelf: Drawn): { back: number; front: number } {
    if (this.open === shelf.tray) return { back: this.unfolded, front: this.unfolded };
    if (this.#notes) return this.#noteLimits(shelf);
    const small = this.#style('--tile');
    const large = this.#style('--tile-front');
    const room = this.#room(shelf.tray === PILE);
    const back = this.#columns(small, room);
    const front = this.#columns(large, room);
    if (shelf.tray === PILE) return { back: back * PILE_ROWS, front: 0 };
    if (shelf.front.length === 0) return { back: back * 2 * BACK_ROWS, front: 0 };
    return { back: back * BACK_ROWS, front: front * (shelf.back.length <= back ? 2 * FRONT_ROWS : FRONT_ROWS) };
  }

  #unfold(tray: number | undefined): void {
    const shown = this.renderRoot.querySelectorAll(`[data-tray='${tray}'] [data-item]`).length;
    this.open = tray;
    this.unfolded = shown + UNFOLD;
  }

  /** The rest of an unfolded shelf follows frame by frame. */
  #unfoldOn(): void {
    const shelf = this.#drawn().find(({ tray }) => tray === this.open);
    if (!shelf || this.unfolded >= Math.max(shelf.back.length, shelf.front.length)) return;
    requestAnimationFrame(() => (this.unfolded += UNFOLD));
  }

  #shelf(shelf: Drawn): TemplateResult {
    const { tray, name } = shelf;
    const total = shelf.back.length + shelf.front.length;
    const { back, front } = this.#limits(shelf);
    const open = this.open === tray;
    const hidden = open ? 0 : Math.max(0, shelf.back.length - back) + Math.max(0, shelf.front.length - front);
    const key = trayKey(shelf.place);
    const isTray = tray >= 0;
    return html`<section
      class="shelf ${open || tray === PILE ? 'wide' : ''} ${this.over === tray ? 'over' : ''}"
      aria-label=${name}
      data-tray=${tray}
      @dragover=${(event: DragEvent) => this.#onDragOver(event, tray)}
      @dragleave=${() => (this.over = undefined)}
      @drop=${(event: DragEvent) => this.#onDrop(event, tray)}
    >
      <div class="rows">
        <div class="back" role="group" aria-label=${isTray ? words.sureOf(name) : name} ?hidden=${shelf.back.length === 0}></div>
        <div class="front" role="group" aria-label=${isTray ? words.unsureOf(name) : words.asideBySorter} ?hidden=${shelf.front.length === 0}></div>
        ${total === 0 ? html`<p class="soft empty">${words.emptyTray}</p>` : nothing}
      </div>
      <div class="plate">
        ${key && isTray ? html`<kbd class="hint" aria-hidden="true">${key}</kbd>` : nothing}
        <h3 title=${name}>${name}</h3>
        <span class="soft total">${count(total)}${shelf.note ? html`, ${shelf.note}` : nothing}</span>
        ${shelf.front.length > 0 ? html`<span class="unsure">${count(shelf.front.length)} ${isTray ? words.unsure : words.bySorter}</span>` : nothing}
        <span class="space"></span>
        ${hidden > 0 || open
          ? html`<button
              class="plain"
              aria-expanded=${open ? 'true' : 'false'}
              aria-label=${open ? words.fewer : words.moreLong(hidden, name)}
              @click=${() => this.#unfold(open ? undefined : tray)}
            >
              ${open ? words.fewer : html`${words.more[0](hidden)}<span class="long">${words.more[1]}</span>`}
            </button>`
          : nothing}
        ${isTray
          ? html`<button class="plain menu" aria-label=${words.trayMenu(name)} @click=${() => tell(this, 'tray-menu', { tray })}>
              <svg viewBox="0 0 20 20" aria-hidden="true"><circle cx="4" cy="10" r="1.900" /><circle cx="10" cy="10" r="1.900" /><circle cx="16" cy="10" r="1.900" /></svg>
            </button>`
          : nothing}
      </div>
    </section>`;
  }

  override updated(changed: PropertyValues<this>): void {
    if (this.width === 0) this.#measure();
    const had = this.keyedItem;
    const { snapshot } = this;
    if (!snapshot) return;
    this.tiles.update(this.items, snapshot, this.hand, changed.has('movedItems') ? this.movedItems : undefined);
    const shown = new Set<number>();
    for (const shelf of this.#drawn()) {
      const element = this.renderRoot.querySelector(`[data-tray='${shelf.tray}']`);
      const back = element?.querySelector<HTMLElement>('.back');
      const front = element?.querySelector<HTMLElement>('.front');
      if (!back || !front) continue;
      const limits = this.#limits(shelf);
      const stops = [...shelf.front.slice(0, limits.front), ...shelf.back.slice(0, limits.back)];
      const stop = this.#focused !== undefined && stops.includes(this.#focused) ? this.#focused : stops[0];
      this.tiles.arrange(back, shelf.back, limits.back, shelf.name, stop);
      this.tiles.arrange(front, shelf.front, limits.front, shelf.name, stop);
      for (const item of stops) shown.add(item);
    }
    this.tiles.sweep(shown);
    if (changed.has('unfolded') || changed.has('view')) this.#unfoldOn();
    if (had !== undefined && this.#focusedItem === undefined) {
      const element = this.renderRoot.querySelector<HTMLElement>(`[data-item='${had}']`);
      if (element) this.#focus(element);
    }
  }

  #focus(tile: HTMLElement): void {
    tile.focus();
  }

  #onFocus(event: FocusEvent): void {
    const tile = (event.target as HTMLElement).closest<HTMLElement>('[data-item]');
    if (!tile) return;
    this.#keyed = !this.#pointing;
    this.#focused = Number(tile.dataset['item']);
    for (const other of tile.closest('.shelf')?.querySelectorAll<HTMLElement>('[data-item]') ?? []) {
      other.tabIndex = other === tile ? 0 : -1;
    }
  }

  #onClick(event: MouseEvent): void {
    const tile = (event.target as HTMLElement).closest<HTMLElement>('[data-item]');
    if (tile) tell(this, 'take', { item: Number(tile.dataset['item']) });
  }

  #onKey(event: KeyboardEvent): void {
    const tile = (event.target as HTMLElement).closest<HTMLElement>('[data-item]');
    if (!tile || event.ctrlKey || event.metaKey || event.altKey) return;
    // A tile that was only pointed at is not what Enter means: that is the guess for the item in hand.
    if (event.key === 'Enter' && !this.#keyed) return;
    if (event.key === 'Enter' || event.key === ' ') {
      tell(this, 'take', { item: Number(tile.dataset['item']) });
    } else {
      const next = this.#neighbour(tile, event.key);
      if (!next) return;
      this.#focus(next);
    }
    event.preventDefault();
    event.stopPropagation();
  }

  #neighbour(tile: HTMLElement, key: string): HTMLElement | undefined {
    const all = [...this.renderRoot.querySelectorAll<HTMLElement>('[data-item]')];
    const at = all.indexOf(tile);
    if (key === 'ArrowRight') return all[at + 1];
    if (key === 'ArrowLeft') return all[at - 1];
    const inShelf = [...(tile.closest('.shelf')?.querySelectorAll<HTMLElement>('[data-item]') ?? [])];
    if (key === 'Home') return inShelf[0];
    if (key === 'End') return inShelf[inShelf.length - 1];
    if (key !== 'ArrowDown' && key !== 'ArrowUp') return undefined;
    const down = key === 'ArrowDown' ? 1 : -1;
    const from = tile.getBoundingClientRect();
    let best: HTMLElement | undefined;
    let least = Infinity;
    for (const other of all) {
      const to = other.getBoundingClientRect();
      const rise = down * (to.top + to.bottom - from.top - from.bottom);
      if (rise <= from.height / 2) continue;
      // A step down is worth more than a step aside, else one would leave the column.
      const distance = rise + 3 * Math.abs(to.left + to.right - from.left - from.right);
      if (distance < least) {
        least = distance;
        best = other;
      }
    }
    return best;
  }

  #onDragOver(event: DragEvent, tray: number): void {
    if (tray === PILE || !event.dataTransfer?.types.includes(ITEM_TYPE)) return;
    event.preventDefault();
    this.over = tray;
  }

  #onDrop(event: DragEvent, tray: number): void {
    this.over = undefined;
    const dragged = event.dataTransfer?.getData(ITEM_TYPE);
    if (!dragged) return;
    event.preventDefault();
    tell(this, 'place', { item: Number(dragged), tray });
  }

  static override styles = [
    shared,
    Tiles.styles,
    css`
      :host {
        display: block;
        --tile: 42px;
        --tile-front: 76px;
      }
      @media (pointer: coarse) {
        :host {
          --tile: 46px;
        }
      }
      .shelves {
        display: grid;
        grid-template-columns: repeat(auto-fill, minmax(min(330px, 100%), 1fr));
        gap: 18px 20px;
      }
      .shelf {
        display: flex;
        flex-direction: column;
        min-width: 0;
        container-type: inline-size;
        border-radius: 12px;
        background: var(--surface);
        outline: 2px solid transparent;
      }
      .shelf.wide {
        grid-column: 1 / -1;
      }
      .shelf.over {
        outline: 3px solid var(--ink);
      }
      .rows {
        flex: 1;
        display: flex;
        flex-direction: column;
        justify-content: flex-end;
        gap: 10px;
        margin: 12px 12px 0;
        min-height: 60px;
      }
      .back,
      .front {
        display: grid;
        gap: 5px;
      }
      .back {
        grid-template-columns: repeat(auto-fill, var(--tile));
        justify-content: start;
      }
      .front {
        grid-template-columns: repeat(auto-fill, minmax(var(--tile-front), 1fr));
      }
      .notes .back,
      .notes .front {
        grid-template-columns: repeat(auto-fill, minmax(min(290px, 100%), 1fr));
        justify-content: stretch;
        gap: 4px 8px;
      }
      .notes .front {
        gap: 6px 8px;
      }
      .plate {
        display: flex;
        align-items: center;
        gap: 0.45rem;
        min-height: 46px;
        margin-top: 10px;
        padding: 2px 4px 2px 12px;
        border-top: 5px solid var(--edge);
        border-radius: 0 0 12px 12px;
        background: var(--quiet);
      }
      h3 {
        font-size: 1rem;
        line-height: 1.2;
        min-width: 0;
        overflow-wrap: anywhere;
        display: -webkit-box;
        -webkit-box-orient: vertical;
        -webkit-line-clamp: 2;
        overflow: hidden;
      }
      .total {
        font-variant-numeric: tabular-nums;
        white-space: nowrap;
      }
      .unsure {
        font-size: 0.84rem;
        white-space: nowrap;
        padding: 0 0.4em;
        border: 1px dashed var(--edge);
        border-radius: 6px;
      }
      .space {
        flex: 1;
      }
      .plate button {
        padding-inline: 0.6rem;
      }
      .menu svg {
        width: 20px;
        display: block;
        fill: currentColor;
      }
      .long {
        display: none;
        white-space: pre;
      }
      @container (min-width: 460px) {
        .long {
          display: inline;
        }
      }
      .empty {
        font-size: 0.9rem;
        align-self: center;
        margin-block: auto;
      }
    `,
  ];
}

customElements.define('ken-shelves', Shelves);
