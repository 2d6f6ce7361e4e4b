import { css } from 'lit';
import { Aside, type Item, type Snapshot, Status } from '../kit/client';
import { ITEM_TYPE } from './event';
import { asideOf, plausibleOf } from './view';
import { percent, words } from './words';

interface Tile {
  element: HTMLElement;
  figure: HTMLElement;
}

/**
 * The small pictures. Each item keeps its element while it is shown, whatever shelf it goes to, so that a picture is not
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
    const blob = this.#items[number]?.thumbnail;
    if (!blob) return undefined;
    const url = URL.createObjectURL(blob);
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
    const how = {
      answered: words.howAnswered,
      aside: words.howAside,
      unlike: words.reasons[reason] ?? '',
      sorted: words.howSure(probability, this.#others(item)),
      unsorted: words.howUnsorted,
    }[kind];
    const { element, figure } = tile;
    element.dataset['kind'] = kind;
    element.classList.toggle('hand', item === this.#hand);
    const label = words.tile(this.#items[item]?.name ?? '', shelf, how);
    if (element.ariaLabel !== label) {
      element.ariaLabel = label;
      element.title = label;
      figure.textContent = kind === 'sorted' ? percent(probability) : kind === 'unlike' ? (words.reasonsShort[reason] ?? '') : '';
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
    const image = document.createElement('img');
    image.alt = '';
    image.draggable = false;
    image.decoding = 'async';
    image.loading = 'lazy';
    const url = this.url(item);
    if (url) image.src = url;
    const figure = document.createElement('span');
    figure.className = 'figure';
    element.append(image, figure);
    const tile = { element, figure };
    this.#tiles.set(item, tile);
    return tile;
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
    .tile .figure {
      display: none;
    }
    .front .tile .figure {
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
    .front .tile::before {
      content: '';
      position: absolute;
      z-index: 1;
      inset-inline-start: 0;
      inset-block-end: 18px;
      height: 4px;
      width: calc(var(--fraction) * 100%);
      border-radius: 2px;
      background: var(--edge);
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
