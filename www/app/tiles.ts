import { css } from 'lit';
import { Aside, type Item, type Snapshot, Status } from '../kit/client';
import { ITEM_TYPE } from './event';
import { asideOf, plausibleOf } from './view';
import { percent, words } from './words';

/** Characters of a note on its tile, in its label, and in the text that shows when a pointer rests on it. */
const ON_TILE = 300;
const IN_LABEL = 120;
const IN_HAND = 1500;

/** The beginning of a text, in one line. */
export function excerpt(text: string, characters: number): string {
  const cut = text.slice(0, characters + 1).trim().replace(/\s+/g, ' ');
  return text.trim().length > characters ? `${cut.slice(0, characters).trimEnd()} …` : cut;
}

interface Tile {
  element: HTMLElement;
  figure: HTMLElement;
  /** The other plausible trays. */
  others: HTMLElement;
  /** What the item is called in labels: a note by its beginning. */
  called: string;
}

/**
 * The small pictures, or for notes their first lines. Each item keeps its element while it is shown, whatever shelf it goes to, so that a picture is not
 * decoded again for every answer.
 */
export class Tiles {
  readonly #tiles = new Map<number, Tile>();
  readonly #urls = new Map<number, string>();
  #items: readonly Item[] = [];
  #snapshot: Snapshot | undefined;
  #hand: number | undefined;

  /** The small picture of an item, as an address that lasts until `clear`. */
  url(number: number): string | undefined {
    const known = this.#urls.get(number);
    if (known) return known;
    const item = this.#items[number];
    if (!item || !('thumbnail' in item) || !item.thumbnail) return undefined;
    const url = URL.createObjectURL(item.thumbnail);
    this.#urls.set(number, url);
    return url;
  }

  clear(): void {
    for (const url of this.#urls.values()) URL.revokeObjectURL(url);
    this.#urls.clear();
    this.#tiles.clear();
  }

  know(items: readonly Item[]): void {
    this.#items = items;
  }

  /** `moved`: the items that changed shelf with this very update. */
  update(items: readonly Item[], snapshot: Snapshot, hand: number | undefined, moved: ReadonlySet<number> | undefined): void {
    this.#items = items;
    this.#snapshot = snapshot;
    this.#hand = hand;
    if (!moved) return;
    for (const [item, { element }] of this.#tiles) element.classList.toggle('moved', moved.has(item));
  }

  /** Makes the row show the first `limit` items, with as few moves as the order allows. */
  arrange(row: HTMLElement, items: readonly number[], limit: number, shelf: string, stop: number | undefined): void {
    const shown = Math.min(items.length, limit);
    for (let index = 0; index < shown; index++) {
      const item = items[index];
      if (item === undefined) continue;
      const { element } = this.#draw(item, shelf);
      element.tabIndex = item === stop ? 0 : -1;
      const there = row.children[index];
      if (there !== element) row.insertBefore(element, there ?? null);
    }
    while (row.children.length > shown) row.lastElementChild?.remove();
  }

  /** Forgets elements that are not shown any more. */
  sweep(shown: ReadonlySet<number>): void {
    if (this.#tiles.size < 2 * shown.size + 200) return;
    for (const item of this.#tiles.keys()) if (!shown.has(item)) this.#tiles.delete(item);
  }

  #draw(item: number, shelf: string): Tile {
    const tile = this.#tiles.get(item) ?? this.#make(item);
    const verdicts = this.#snapshot?.verdicts;
    const probability = verdicts?.probability[item] ?? 0;
    const status = verdicts?.status[item] ?? Status.sorted;
    const sorted = (verdicts?.tray[item] ?? -1) >= 0;
    const reason = verdicts ? asideOf(verdicts, item) : Aside.not;
    const kind =
      status === Status.answered
        ? 'answered'
        : status === Status.none
          ? 'aside'
          : reason !== Aside.not
            ? 'unlike'
            : sorted
              ? 'sorted'
              : 'unsorted';
    const others = kind === 'sorted' ? this.#others(item) : [];
    const how = {
      answered: words.howAnswered,
      aside: words.howAside,
      unlike: words.reasons[reason] ?? '',
      sorted: words.howSure(probability, others),
      unsorted: words.howUnsorted,
    }[kind];
    const { element, figure, others: or, called } = tile;
    element.dataset['kind'] = kind;
    element.classList.toggle('hand', item === this.#hand);
    const label = words.tile(called, shelf, how);
    if (element.ariaLabel !== label) {
      element.ariaLabel = label;
      const of = this.#items[item];
      const note = of && 'text' in of ? of.text : undefined;
      element.title = note === undefined ? label : words.tileInHand(note.length > IN_HAND ? `${note.slice(0, IN_HAND)} …` : note, how);
      figure.textContent = kind === 'sorted' ? percent(probability) : kind === 'unlike' ? (words.reasonsShort[reason] ?? '') : '';
      or.textContent = others.length > 0 ? words.orElse(others) : '';
      element.style.setProperty('--fraction', kind === 'sorted' ? probability.toFixed(3) : '0');
    }
    return tile;
  }

  /** Names of the plausible trays other than the one it is in. */
  #others(item: number): string[] {
    if (!this.#snapshot) return [];
    const { trays, verdicts } = this.#snapshot;
    const others = plausibleOf(this.#snapshot, item).filter((tray) => tray !== verdicts.tray[item]);
    return others.map((tray) => trays.find((one) => one.tray === tray)?.name ?? '');
  }

  #make(item: number): Tile {
    const element = document.createElement('div');
    element.className = 'tile';
    element.dataset['item'] = String(item);
    element.role = 'button';
    element.draggable = true;
    element.addEventListener('dragstart', (event) => event.dataTransfer?.setData(ITEM_TYPE, String(item)));
    element.addEventListener('animationend', () => element.classList.remove('moved'));
    const figure = document.createElement('span');
    figure.className = 'figure';
    const others = document.createElement('span');
    others.className = 'others';
    element.append(this.#face(item, element), figure, others);
    const of = this.#items[item];
    const called = of && 'text' in of ? excerpt(of.text, IN_LABEL) : (of?.name ?? '');
    const tile = { element, figure, others, called };
    this.#tiles.set(item, tile);
    return tile;
  }

  #face(number: number, element: HTMLElement): HTMLElement {
    const item = this.#items[number];
    if (item && 'text' in item) {
      element.classList.add('note');
      const text = document.createElement('span');
      text.className = 'text';
      text.dir = 'auto';
      text.textContent = excerpt(item.text, ON_TILE);
      return text;
    }
    const image = document.createElement('img');
    image.alt = '';
    image.draggable = false;
    image.decoding = 'async';
    image.loading = 'lazy';
    const url = this.url(number);
    if (url) image.src = url;
    return image;
  }

  static readonly styles = css`
    .tile {
      position: relative;
      display: block;
      width: var(--tile);
      height: var(--tile);
      border-radius: 6px;
      background: var(--quiet);
      cursor: pointer;
      user-select: none;
      -webkit-user-select: none;
    }
    .tile img {
      display: block;
      width: 100%;
      height: 100%;
      object-fit: cover;
      border-radius: inherit;
    }
    .front .tile img {
      height: auto;
      aspect-ratio: 1;
    }
    .tile .figure,
    .tile .others {
      display: none;
    }
    .front .tile .others:not(:empty) {
      display: block;
      margin-top: -3px;
      overflow: hidden;
      text-overflow: ellipsis;
      white-space: nowrap;
      font-size: 0.74rem;
      line-height: 1.2;
      text-align: center;
      color: var(--ink-soft);
    }
    .front .tile .figure {
      position: relative;
      display: block;
      height: 24px;
      padding-top: 5px;
      font-size: 0.8rem;
      line-height: 19px;
      text-align: center;
      font-variant-numeric: tabular-nums;
      color: var(--ink);
    }
    .front .tile {
      width: auto;
      height: auto;
      background: transparent;
    }
    .front .tile .figure::before {
      content: '';
      position: absolute;
      inset-inline-start: 0;
      inset-block-start: 2px;
      height: 4px;
      width: calc(var(--fraction) * 100%);
      border-radius: 2px;
      background: var(--edge);
    }
    .tile.note,
    .front .tile.note {
      width: auto;
      height: auto;
      padding: 3px 9px;
      background: var(--raised);
      font-size: 0.86rem;
      line-height: 1.4;
    }
    /* Of hundreds of lines only those in sight are laid out. */
    .wide .tile.note {
      content-visibility: auto;
      contain-intrinsic-size: auto 27px;
    }
    .note .text {
      display: -webkit-box;
      -webkit-box-orient: vertical;
      -webkit-line-clamp: 1;
      overflow: hidden;
      overflow-wrap: anywhere;
    }
    .front .tile.note {
      display: grid;
      grid-template-columns: minmax(0, 1fr) auto;
      gap: 0 10px;
      padding: 6px 10px 10px;
      font-size: 0.98rem;
    }
    .wide .front .tile.note {
      contain-intrinsic-size: auto 60px;
    }
    .front .note .text {
      -webkit-line-clamp: 2;
    }
    .front .tile.note .figure {
      height: auto;
      padding: 0;
      line-height: 1.7;
    }
    .front .tile.note .figure::before {
      display: none;
    }
    .front .tile.note::before {
      content: '';
      position: absolute;
      inset-block-end: 2px;
      inset-inline-start: 8px;
      height: 4px;
      width: calc(var(--fraction) * (100% - 16px));
      border-radius: 2px;
      background: var(--edge);
    }
    .front .tile.note .others {
      grid-column: 1 / -1;
      text-align: start;
    }
    @media (pointer: coarse) {
      .back .tile.note {
        display: grid;
        align-items: center;
        min-height: 44px;
      }
      .wide .back .tile.note {
        contain-intrinsic-size: auto 44px;
      }
      .back .note .text {
        -webkit-line-clamp: 2;
      }
    }
    /* The mark stands in the line: outside of it, it would be cut off with what is not shown. */
    .tile.note[data-kind='answered']::after,
    .tile.note[data-kind='aside']::after {
      inset-inline-end: 6px;
      inset-block: 0;
      margin-block: auto;
    }
    .tile.note[data-kind='answered'] .text,
    .tile.note[data-kind='aside'] .text {
      padding-inline-end: 22px;
    }
    .tile[data-kind='answered']::after,
    .tile[data-kind='aside']::after {
      position: absolute;
      inset-inline-end: -3px;
      inset-block-end: -3px;
      width: 17px;
      height: 17px;
      border-radius: 50%;
      background: var(--ink);
      color: var(--bench);
      font-size: 11px;
      font-weight: 700;
      line-height: 17px;
      text-align: center;
      content: '✓';
    }
    .tile[data-kind='aside']::after {
      content: '–';
    }
    .tile:hover {
      z-index: 1;
      outline: 2px solid var(--ink);
      outline-offset: 1px;
    }
    .tile.hand {
      z-index: 1;
      outline: 4px solid var(--bright);
      outline-offset: 0;
    }
    .tile:focus-visible {
      z-index: 2;
      outline: 3px solid var(--focus);
      outline-offset: 2px;
    }
    @media (prefers-reduced-motion: no-preference) {
      .tile.moved {
        animation: arrive 1.1s ease-out;
      }
    }
    @keyframes arrive {
      0% {
        box-shadow: 0 0 0 4px var(--edge);
        scale: 0.7;
      }
      25% {
        scale: 1;
      }
      100% {
        box-shadow: 0 0 0 0 transparent;
      }
    }
  `;
}
