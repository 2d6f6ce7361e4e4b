import { html, LitElement, nothing, type PropertyValues, type TemplateResult } from 'lit';
import { repeat } from 'lit/directives/repeat.js';
import { type Item, type NoteItem, type Ranked, Status, type Tray } from '../kit/client';
import { ITEM_TYPE, tell, trayKey } from './event';
import { fraction } from './fraction';
import { questionStyles } from './question-styles';
import type { StripInHand } from './strip-in-hand';
import type { StripView } from './strip';
import './strip';
import { shared } from './styles';
import { percent, words } from './words';

interface Option {
  tray: Tray | undefined;
  place: number;
  label: string;
}

/** The item in hand and all ways to answer for it. */
export class Question extends LitElement {
  static override properties = {
    item: { attribute: false },
    picture: { attribute: false },
    trays: { attribute: false },
    ranking: { attribute: false },
    guess: { attribute: false },
    plausible: { attribute: false },
    setAside: { attribute: false },
    status: { attribute: false },
    given: { attribute: false },
    outOfTurn: { type: Boolean },
    strip: { attribute: false },
    stripItems: { attribute: false },
    stripOut: { attribute: false },
    stripInstead: { type: Number },
    busy: { type: Boolean },
    text: { state: true },
    active: { state: true },
  };

  declare item: Item | undefined;
  declare picture: string | undefined;
  declare trays: Tray[];
  declare ranking: Ranked[];
  /** The tray the sorter puts it in, if it dares. */
  declare guess: number | undefined;
  /** The trays that can't be ruled out; absent where nothing is guessed. */
  declare plausible: readonly number[] | undefined;
  /** Why the sorter sets it aside; 0: it does not. */
  declare setAside: number;
  declare status: number;
  /** The tray the person put it in. */
  declare given: number | undefined;
  declare outOfTurn: boolean;
  /** Look-alikes in the place of the item in hand. */
  declare strip: StripInHand | undefined;
  declare stripItems: readonly Item[];
  declare stripOut: ReadonlySet<number>;
  /** How many look-alikes could come instead of the item in hand. */
  declare stripInstead: number;
  /** Whether the strip came so lately that keys don't act on it yet. */
  declare busy: boolean;
  declare text: string;
  declare active: number;

  constructor() {
    super();
    this.trays = [];
    this.ranking = [];
    this.status = 0;
    this.setAside = 0;
    this.outOfTurn = false;
    this.stripItems = [];
    this.stripOut = new Set();
    this.stripInstead = 0;
    this.busy = false;
    this.text = '';
    this.active = 0;
  }

  /** Puts the cursor into the field. */
  find(): void {
    this.#field?.focus();
    this.#field?.select();
  }

  get #stripView(): StripView | null {
    return this.renderRoot.querySelector('ken-strip');
  }

  /** The item of the strip that keys are about. */
  get stripItem(): number | undefined {
    return this.#stripView?.item;
  }

  /** Leads the focus into the strip. */
  enterStrip(): void {
    this.#stripView?.focus();
  }

  #hadFocus = false;

  /** Leaves the field and takes the focus, so that keys act on the item in hand. */
  settle(): void {
    this.text = '';
    const heading = this.renderRoot.querySelector<HTMLElement>('h2');
    if (!heading) return;
    const { top, bottom } = heading.getBoundingClientRect();
    heading.focus({ preventScroll: top >= 0 && bottom <= innerHeight });
  }

  /** Where the page is too short for everything, the next item would else stay above what was just answered. */
  #show(): void {
    const mat = this.renderRoot.querySelector('.mat, ken-strip');
    if (!mat) return;
    const { top, bottom, height } = mat.getBoundingClientRect();
    const visible = Math.min(bottom, innerHeight) - Math.max(top, 0);
    if (visible < Math.min(height, innerHeight) * 0.6) this.renderRoot.querySelector('section')?.scrollIntoView({ block: 'start' });
  }

  get #field(): HTMLInputElement | null {
    return this.renderRoot.querySelector('input');
  }

  override willUpdate(changed: PropertyValues<this>): void {
    if (!this.#isNext(changed)) return;
    this.text = '';
    this.#hadFocus = (this.renderRoot as ShadowRoot).activeElement !== null;
  }

  /** The next note begins at its top. */
  #scrollUp(): void {
    const text = this.renderRoot.querySelector('.text');
    if (text) text.scrollTop = 0;
  }

  /** The next question takes the keys: what was focused belonged to the last one. */
  override updated(changed: PropertyValues<this>): void {
    if (changed.has('guess') || changed.has('ranking') || changed.has('busy') || this.#isNext(changed)) this.#showGuess();
    if (!this.#isNext(changed)) return;
    this.#scrollUp();
    if (this.#hadFocus) this.settle();
    // Not for the first item: nothing has been answered yet.
    if (changed.get('item') ?? changed.get('strip')) this.#show();
  }

  /** The guess is never hidden by the scrolling of the trays. */
  #showGuess(): void {
    const rows = this.renderRoot.querySelector('.rows');
    const guess = rows?.querySelector('.guessed');
    if (!rows || !guess) return;
    const frame = rows.getBoundingClientRect();
    const { top, bottom } = guess.getBoundingClientRect();
    if (top < frame.top) rows.scrollTop += top - frame.top - 6;
    else if (bottom > frame.bottom) rows.scrollTop += bottom - frame.bottom + 6;
  }

  #isNext(changed: PropertyValues<this>): boolean {
    if (changed.has('strip') && this.strip) return true;
    return changed.has('item') && changed.get('item')?.number !== this.item?.number;
  }

  get #options(): Option[] {
    const typed = this.text.trim();
    const key = typed.toLocaleLowerCase();
    const all = this.trays.map((tray, place): Option => ({ tray, place, label: tray.name }));
    const starting = all.filter(({ label }) => label.toLocaleLowerCase().startsWith(key));
    const within = all.filter((option) => option.label.toLocaleLowerCase().includes(key) && !starting.includes(option));
    const found = [...starting, ...within];
    if (!all.some(({ label }) => label.toLocaleLowerCase() === key)) {
      const fresh = { tray: undefined, place: -1, label: typed };
      // A name that no tray begins with is a new one; the others come second.
      if (starting.length === 0) found.unshift(fresh);
      else found.push(fresh);
    }
    return found;
  }

  #choose(option: Option | undefined): void {
    if (!option) return;
    if (option.tray) tell(this, 'answer', { tray: option.tray.tray });
    else if (option.label) tell(this, 'answer-new', { name: option.label });
  }

  #onFieldKey(event: KeyboardEvent): void {
    const options = this.text.trim() ? this.#options : [];
    if (event.key === 'Escape') {
      this.settle();
    } else if (event.key === 'Enter' && !event.isComposing) {
      if (!event.repeat) this.#choose(options[this.active]);
    } else if (event.key === 'ArrowDown' && options.length > 0) {
      this.active = (this.active + 1) % options.length;
    } else if (event.key === 'ArrowUp' && options.length > 0) {
      this.active = (this.active + options.length - 1) % options.length;
    } else {
      return;
    }
    event.preventDefault();
  }

  #onDrop(event: DragEvent, tray: number): void {
    const dragged = event.dataTransfer?.getData(ITEM_TYPE);
    if (!dragged) return;
    event.preventDefault();
    tell(this, 'place', { item: Number(dragged), tray });
  }

  #onDragOver(event: DragEvent): void {
    if (event.dataTransfer?.types.includes(ITEM_TYPE)) event.preventDefault();
  }

  override render(): TemplateResult {
    const { item, strip } = this;
    if (!item && !strip) {
      return html`<section aria-labelledby="ask">
        <h2 id="ask" tabindex="-1">${words.nothingToAsk}</h2>
        <p class="soft">${words.nothingToAskHint}</p>
      </section>`;
    }
    const typing = this.text.trim() !== '';
    return html`
      <section aria-labelledby="ask">
        ${strip ? this.#strip(strip) : item ? this.#inHand(item) : nothing} ${this.#standing()} ${this.#doubtful()}
        ${this.trays.length > 0 && !typing ? this.#rows() : nothing}
        <div class="field">
          <input
            type="text"
            role="combobox"
            aria-label=${this.trays.length === 0 ? words.firstTray : words.findTray}
            aria-expanded=${typing ? 'true' : 'false'}
            aria-controls="found"
            aria-autocomplete="list"
            aria-activedescendant=${typing ? `found-${this.active}` : nothing}
            autocomplete="off"
            autocapitalize="sentences"
            spellcheck="false"
            maxlength="120"
            enterkeyhint="done"
            placeholder=${this.trays.length === 0 ? words.firstTray : words.findTray}
            .value=${this.text}
            @input=${(event: InputEvent) => {
              this.text = (event.target as HTMLInputElement).value;
              this.active = 0;
            }}
            @keydown=${this.#onFieldKey}
          />
          ${this.trays.length > 0 && !typing ? html`<kbd class="hint in-field" aria-hidden="true">T</kbd>` : nothing}
        </div>
        <div id="found" role="listbox" aria-label=${words.choices} ?hidden=${!typing}>${typing ? this.#found() : nothing}</div>
        ${this.trays.length === 0 ? html`<p class="soft hint-line">${words.firstTrayHint}</p>` : nothing}
        ${this.trays.length === 1 ? html`<p class="soft hint-line">${words.secondTrayHint}</p>` : nothing}
        <div class="row ways">
          <button @click=${() => tell(this, 'none', {})}>${words.none} <kbd class="hint">N</kbd></button>
          <button @click=${() => tell(this, 'skip', {})}>${words.cantTell} <kbd class="hint">C</kbd></button>
          ${this.outOfTurn
            ? html`<button class="plain" @click=${() => tell(this, 'back', {})}>${words.backToQuestion} <kbd class="hint">Q</kbd></button>`
            : this.#otherWay()}
        </div>
      </section>
    `;
  }

  #note({ text, name, parts, rows }: NoteItem): TemplateResult {
    const facts = [...(parts > 1 ? [words.inParts(parts)] : []), ...(rows > 1 ? [words.timesOver(rows)] : [])];
    return html`<div class="mat note">
      <div class="text" role="group" aria-label=${words.noteInHand(name)} tabindex="0" dir="auto">${text}</div>
      <div class="row under">
        <span>${facts.join(' ')}</span>
        <button @click=${() => tell(this, 'zoom', {})}>${words.zoom} <kbd class="hint">Z</kbd></button>
      </div>
    </div>`;
  }

  #inHand(item: Item): TemplateResult {
    return html`<header>
        <h2 id="ask" tabindex="-1">${words.question}</h2>
        <p class="soft name" title=${item.name}>${item.name}</p>
      </header>
      ${'text' in item
        ? this.#note(item)
        : html`<div class="mat">
        <img
          src=${this.picture ?? nothing}
          alt=${item.name}
          draggable="true"
          @dragstart=${(event: DragEvent) => event.dataTransfer?.setData(ITEM_TYPE, String(item.number))}
        />
        <button class="zoom" @click=${() => tell(this, 'zoom', {})}>${words.zoom} <kbd class="hint">Z</kbd></button>
      </div>`}`;
  }

  #strip(strip: StripInHand): TemplateResult {
    const name = this.trays.find(({ tray }) => tray === strip.tray)?.name ?? '';
    const items = this.stripItems.length;
    const kind = this.stripItems.some((item) => 'text' in item) ? 'notes' : 'photos';
    return html`<header>
        <h2 id="ask" tabindex="-1">${words.stripQuestion(name)}</h2>
        <p class="soft name count">${words.stripCount(kind, items - this.stripOut.size, this.stripOut.size)}</p>
      </header>
      <p class="soft hint-line">${words.stripHint}</p>
      <ken-strip .items=${this.stripItems} .out=${this.stripOut} label=${words.strip(kind, items, name)} aria-busy=${this.busy ? 'true' : 'false'}></ken-strip>`;
  }

  /** From single questions to strips and back. */
  #otherWay(): TemplateResult | typeof nothing {
    const text = this.strip ? words.oneAtATime : this.stripInstead > 0 ? words.together(this.stripInstead) : undefined;
    if (text === undefined) return nothing;
    return html`<button class="plain" @click=${() => tell(this, 'strips', {})}>${text} <kbd class="hint">S</kbd></button>`;
  }

  #standing(): TemplateResult | typeof nothing {
    const tray = this.trays.find((one) => one.tray === this.given);
    const text =
      this.status === Status.answered && tray
        ? words.yourAnswer(tray.name)
        : this.status === Status.none
          ? words.yourNone
          : this.status === Status.skipped
            ? words.askedEarlier
            : undefined;
    if (!text) return nothing;
    return html`<p class="standing">
      ${text}. <button class="plain" @click=${() => tell(this, 'withdraw', {})}>${words.withdraw}</button>
    </p>`;
  }

  /** What the sorter has to say against its own guess. */
  #doubtful(): TemplateResult | typeof nothing {
    const reason = words.reasons[this.setAside];
    const text = reason ? words.setAsideSince(reason) : this.plausible?.length === 0 ? words.nothingPlausible : undefined;
    return text ? html`<p class="standing">${text}</p>` : nothing;
  }

  #rows(): TemplateResult {
    const probability = new Map(this.ranking.map((ranked) => [ranked.tray, ranked.probability]));
    return html`<ul class="rows" aria-label=${words.choices}>
      ${repeat(
        this.trays,
        ({ tray }) => tray,
        ({ tray, name }, place) => {
          const share = this.strip || this.guess === undefined ? undefined : probability.get(tray);
          const guessed = tray === (this.strip?.tray ?? this.guess);
          const plausible = !guessed && (this.plausible?.includes(tray) ?? false);
          const key = trayKey(place);
          return html`<li>
            <button
              class="choice ${guessed ? 'guessed' : ''} ${plausible ? 'plausible' : ''} ${tray === this.given ? 'given' : ''}"
              title=${name}
              ${fraction(share ?? 0)}
              @click=${() => tell(this, 'answer', { tray })}
              @dragover=${this.#onDragOver}
              @drop=${(event: DragEvent) => this.#onDrop(event, tray)}
            >
              ${key ? html`<kbd>${key}</kbd>` : html`<span class="no-key"></span>`}
              <span class="label">${name}</span>
              ${share === undefined ? nothing : html`<span class="figure">${percent(share)}</span>`}
              ${guessed ? html`<span class="guess">${this.#guessed()} <kbd class="hint">Enter</kbd></span>` : nothing}
              ${plausible ? html`<span class="guess">${words.plausible}</span>` : nothing}
            </button>
          </li>`;
        },
      )}
    </ul>`;
  }

  #guessed(): string {
    return this.strip ? words.stripGuess(this.stripItems.length - this.stripOut.size) : words.guess;
  }

  #found(): TemplateResult[] {
    return this.#options.map(
      (option, index) => html`<div
        id="found-${index}"
        role="option"
        class="choice option"
        aria-selected=${index === this.active ? 'true' : 'false'}
        @pointerdown=${(event: PointerEvent) => event.preventDefault()}
        @click=${() => this.#choose(option)}
      >
        ${option.tray ? html`<kbd aria-hidden="true">${trayKey(option.place) ?? '·'}</kbd>` : html`<kbd aria-hidden="true">+</kbd>`}
        <span class="label">${option.tray ? option.label : words.newTray(option.label)}</span>
      </div>`,
    );
  }

  static override styles = [shared, questionStyles];
}

customElements.define('ken-question', Question);
