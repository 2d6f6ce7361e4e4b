import { css, html, LitElement, nothing, type PropertyValues, type TemplateResult } from 'lit';
import { repeat } from 'lit/directives/repeat.js';
import type { Item, PhotoItem } from '../kit/client';
import { tell } from './event';
import { shared } from './styles';
import { excerpt } from './tiles';
import { words } from './words';

/** Characters of a note in a label, and in what shows when one points at it. */
const IN_LABEL = 60;
const IN_TITLE = 600;

/** Look-alikes in the place of the item in hand. Each is a button that takes it out, or back in. */
export class StripView extends LitElement {
  static override properties = {
    items: { attribute: false },
    out: { attribute: false },
    label: { type: String },
    at: { state: true },
  };

  declare items: readonly Item[];
  declare out: ReadonlySet<number>;
  declare label: string;
  /** The item that arrows led to or that was tapped last. */
  declare at: number | undefined;
  readonly #urls = new Map<number, string>();
  #hadFocus = false;
  #place = 0;

  constructor() {
    super();
    this.items = [];
    this.out = new Set();
    this.label = '';
  }

  override disconnectedCallback(): void {
    super.disconnectedCallback();
    for (const url of this.#urls.values()) URL.revokeObjectURL(url);
    this.#urls.clear();
  }

  /** The item that “none of these”, “can’t tell”, zoom and Delete are about. */
  get item(): number | undefined {
    return this.at;
  }

  /** Leads the focus to the item it was on last. */
  override focus(): void {
    this.#focus(this.items.findIndex(({ number }) => number === this.at));
  }

  #focus(place: number): void {
    const tiles = this.renderRoot.querySelectorAll<HTMLElement>('button');
    tiles[Math.max(0, Math.min(place, tiles.length - 1))]?.focus();
  }

  #url({ number, thumbnail }: PhotoItem): string | undefined {
    const known = this.#urls.get(number);
    if (known || !thumbnail) return known;
    const url = URL.createObjectURL(thumbnail);
    this.#urls.set(number, url);
    return url;
  }

  #face(item: Item): TemplateResult {
    if ('text' in item) return html`<span class="text" dir="auto">${item.text}</span>`;
    return html`<img src=${this.#url(item) ?? nothing} alt="" draggable="false" />`;
  }

  override willUpdate(changed: PropertyValues<this>): void {
    if (!changed.has('items') || this.items.some(({ number }) => number === this.at)) return;
    this.#hadFocus = this.at !== undefined && (this.renderRoot as ShadowRoot).activeElement !== null;
    const before = (changed.get('items') as readonly Item[] | undefined) ?? [];
    this.#place = before.findIndex(({ number }) => number === this.at);
    // What had the focus has got its own answer and left: the one that took its place follows.
    this.at = this.#place >= 0 ? this.items[Math.min(this.#place, this.items.length - 1)]?.number : undefined;
  }

  override updated(): void {
    if (this.#hadFocus) this.#focus(this.#place);
    this.#hadFocus = false;
  }

  #onKey(event: KeyboardEvent, place: number): void {
    if (event.ctrlKey || event.metaKey || event.altKey || event.shiftKey) return;
    const columns = getComputedStyle(this.renderRoot.querySelector('div') as HTMLElement).gridTemplateColumns.split(' ').length;
    const rtl = getComputedStyle(this).direction === 'rtl' ? -1 : 1;
    const steps: Record<string, number> = { ArrowRight: rtl, ArrowLeft: -rtl, ArrowDown: columns, ArrowUp: -columns };
    const step = steps[event.key];
    if (step !== undefined) {
      const to = place + step;
      if (to >= 0 && to < this.items.length) this.#focus(to);
    } else if (event.key === 'Home' || event.key === 'End') {
      this.#focus(event.key === 'Home' ? 0 : this.items.length - 1);
    } else if (event.key === 'Enter') {
      // Enter is for the whole strip, as it is everywhere else.
      if (!event.repeat) tell(this, 'confirm-strip', {});
    } else {
      return;
    }
    event.preventDefault();
    event.stopPropagation();
  }

  override render(): TemplateResult {
    const stop = this.at ?? this.items[0]?.number;
    const notes = this.items.some((item) => 'text' in item);
    return html`<div role="group" aria-label=${this.label} class=${notes ? 'notes' : ''}>
      ${repeat(
        this.items,
        ({ number }) => number,
        (item, place) => {
          const out = this.out.has(item.number);
          return html`<button
            aria-pressed=${out ? 'true' : 'false'}
            aria-label=${words.takeOut('text' in item ? excerpt(item.text, IN_LABEL) : item.name)}
            title=${'text' in item ? item.text.slice(0, IN_TITLE) : item.name}
            class=${out ? 'out' : ''}
            tabindex=${item.number === stop ? 0 : -1}
            data-item=${item.number}
            @focus=${() => (this.at = item.number)}
            @click=${() => {
              this.at = item.number;
              tell(this, 'toggle-strip', { item: item.number });
            }}
            @keydown=${(event: KeyboardEvent) => this.#onKey(event, place)}
          >
            ${this.#face(item)}
          </button>`;
        },
      )}
    </div>`;
  }

  static override styles = [
    shared,
    css`
      :host {
        display: block;
        overflow: hidden auto;
        scrollbar-width: thin;
        border-radius: 14px;
        background: var(--bright);
      }
      div {
        display: grid;
        grid-template-columns: repeat(auto-fill, minmax(clamp(60px, 17%, 96px), 1fr));
        gap: 8px;
        padding: 10px;
      }
      button {
        position: relative;
        aspect-ratio: 1;
        min-width: 0;
        padding: 0;
        border: 0;
        border-radius: 8px;
        background: var(--quiet);
        overflow: hidden;
      }
      img {
        display: block;
        width: 100%;
        height: 100%;
        object-fit: cover;
      }
      .notes {
        grid-template-columns: repeat(auto-fill, minmax(min(200px, 100%), 1fr));
      }
      .notes button {
        aspect-ratio: auto;
        min-height: 76px;
        padding: 6px 10px;
        text-align: start;
      }
      .text {
        display: -webkit-box;
        -webkit-box-orient: vertical;
        -webkit-line-clamp: 4;
        overflow: hidden;
        overflow-wrap: anywhere;
        font-size: 0.94rem;
        line-height: 1.3;
      }
      button.out img,
      button.out .text {
        opacity: 0.28;
      }
      button.out {
        scale: 0.86;
        box-shadow: 0 0 0 2px var(--ink);
      }
      button.out::after {
        content: '×';
        position: absolute;
        inset: 0;
        display: grid;
        place-items: center;
        font-size: 2.4rem;
        font-weight: 700;
        color: var(--ink);
      }
      button:focus-visible {
        outline: 4px solid var(--focus);
        outline-offset: 1px;
        box-shadow: inset 0 0 0 2px var(--surface);
        z-index: 1;
      }
    `,
  ];
}

customElements.define('ken-strip', StripView);
