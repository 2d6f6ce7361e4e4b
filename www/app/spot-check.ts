import { css, html, nothing, type PropertyValues, type TemplateResult } from 'lit';
import { type CheckView, type Item, type Judgement, type Snapshot, Status } from '../kit/client';
import { tell, trayKey } from './event';
import { commandOf } from './keys';
import { Panel } from './panels';
import { words } from './words';

/** The items of a spot check, one after the other, and what the person says of each. */
export class SpotCheckPanel extends Panel {
  static override properties = {
    check: { attribute: false },
    snapshot: { attribute: false },
    items: { attribute: false },
    pictureOf: { attribute: false },
    originalOf: { attribute: false },
    singleKeys: { type: Boolean },
    problem: { type: String },
    original: { state: true },
  };

  declare check: CheckView;
  declare snapshot: Snapshot;
  declare items: readonly Item[];
  declare pictureOf: (item: number) => string | undefined;
  declare originalOf: (item: number) => Promise<Blob | undefined>;
  declare singleKeys: boolean;
  declare problem: string;
  /** The photo as it came, of the item that is shown. */
  declare original: { item: number; url: string } | undefined;
  protected readonly label = words.trust.tabs.check;
  /** The item that was judged last: until the page knows, no key means the next one. */
  #judged: number | undefined;

  /** Where the person is; the length of the sample at its end. */
  get #at(): number {
    const open = this.check.sample.findIndex(({ judgement }) => judgement === null);
    return open < 0 ? this.check.sample.length : open;
  }

  #say(judgement: Judgement): void {
    const shown = this.check.sample[this.#at];
    if (!shown || shown.item === this.#judged) return;
    this.#judged = shown.item;
    tell(this, 'judge', { item: shown.item, judgement });
  }

  #undo(): void {
    const last = this.check.sample[this.#at - 1];
    if (!last) return;
    this.#judged = undefined;
    tell(this, 'judge', { item: last.item, judgement: null });
  }

  #belongs(tray: number): void {
    this.#say({ belongs: tray });
  }

  #onKey(event: KeyboardEvent): void {
    const command = commandOf(event, this.singleKeys);
    if (!command || event.key === 'Escape') return;
    const ends = this.check.left === 0;
    switch (command.do) {
      case 'guess':
        if (event.repeat) break;
        if (ends) tell(this, 'state-check', {});
        else this.#say('right');
        break;
      case 'tray': {
        const tray = this.snapshot.trays[command.place]?.tray;
        if (tray !== undefined && !event.repeat) this.#belongs(tray);
        break;
      }
      case 'none':
        if (!event.repeat) this.#say('wrong');
        break;
      case 'skip':
        if (!event.repeat) this.#say('untold');
        break;
      case 'undo':
        if (!event.repeat) this.#undo();
        break;
      default:
        return;
    }
    event.preventDefault();
    event.stopPropagation();
  }

  override willUpdate(changed: PropertyValues<this>): void {
    if (!changed.has('check')) return;
    const before = changed.get('check') as CheckView | undefined;
    const shown = this.check.sample[this.#at]?.item;
    if (before === undefined || before !== this.check) this.#judged = undefined;
    if (this.original && this.original.item !== shown) this.#forgetOriginal();
    if (shown !== undefined && this.original?.item !== shown) void this.#fetchOriginal(shown);
  }

  override updated(changed: PropertyValues<this>): void {
    const before = changed.get('check') as CheckView | undefined;
    // What was pressed belonged to the last item; the screen reader reads the next one.
    if (before && before.left !== this.check.left) this.renderRoot.querySelector<HTMLElement>('h2')?.focus();
  }

  override disconnectedCallback(): void {
    super.disconnectedCallback();
    this.#forgetOriginal();
  }

  #forgetOriginal(): void {
    if (this.original) URL.revokeObjectURL(this.original.url);
    this.original = undefined;
  }

  async #fetchOriginal(item: number): Promise<void> {
    const blob = await this.originalOf(item).catch(() => undefined);
    if (!blob || !this.isConnected || this.check.sample[this.#at]?.item !== item || this.original?.item === item) return;
    this.#forgetOriginal();
    this.original = { item, url: URL.createObjectURL(blob) };
  }

  #name(tray: number): string {
    return this.snapshot.trays.find((one) => one.tray === tray)?.name ?? '';
  }

  /** Some of what the person put into the tray: what "right" would be like. */
  #examples(tray: number): number[] {
    const { status, tray: trays } = this.snapshot.verdicts;
    return [...status.keys()].filter((item) => status[item] === Status.answered && trays[item] === tray).slice(0, 4);
  }

  protected content(): TemplateResult {
    const { check } = this;
    const at = this.#at;
    const shown = check.sample[at];
    return html`<div class="work" @keydown=${this.#onKey}>
      <div class="row top">
        <p class="figures">${words.trust.lookedAtOf(check.sample.length - check.left, check.sample.length)}</p>
        <div class="row">
          <button ?disabled=${at === 0} @click=${() => this.#undo()}>${words.undo} <kbd class="hint">U</kbd></button>
          <button @click=${() => this.close()}>${words.trust.pause}</button>
        </div>
      </div>
      <progress aria-label=${words.trust.lookedAt} max=${check.sample.length} .value=${check.sample.length - check.left}></progress>
      <p class="error" role="alert">${this.problem}</p>
      ${shown ? this.#question(shown.item, shown.tray) : this.#end()}
    </div>`;
  }

  #question(item: number, tray: number): TemplateResult {
    const of = this.items[item];
    const url = this.original?.item === item ? this.original.url : this.pictureOf(item);
    const name = this.#name(tray);
    return html`<div class="mat">
        ${url ? html`<img class="shown" src=${url} alt=${of?.name ?? ''} />` : html`<p class="shown text" dir="auto">${of && 'text' in of ? of.text : of?.name}</p>`}
      </div>
      <div class="ask">
        <div class="head">
          <h2 tabindex="-1" autofocus>${words.trust.isIt(name)}</h2>
          <div class="like" aria-hidden="true">
            ${this.#examples(tray).map((one) => {
              const small = this.pictureOf(one);
              if (small) return html`<img src=${small} alt="" />`;
              const like = this.items[one];
              return like && 'text' in like ? html`<span class="line" dir="auto">${like.text}</span>` : nothing;
            })}
          </div>
        </div>
        <button class="bright right" @click=${() => this.#say('right')}>${words.trust.right} <kbd class="hint">Enter</kbd></button>
        <p class="soft" id="elsewhere">${words.trust.elsewhere}</p>
        <ul class="trays" aria-labelledby="elsewhere">
          ${this.snapshot.trays.map((one, place) =>
            one.tray === tray
              ? nothing
              : html`<li>
                  <button @click=${() => this.#belongs(one.tray)}>
                    ${trayKey(place) ? html`<kbd class="hint">${trayKey(place)}</kbd>` : nothing} <span>${one.name}</span>
                  </button>
                </li>`,
          )}
        </ul>
        <div class="row">
          <button @click=${() => this.#say('wrong')}>${words.none} <kbd class="hint">N</kbd></button>
          <button @click=${() => this.#say('untold')}>${words.cantTell} <kbd class="hint">C</kbd></button>
        </div>
      </div>`;
  }

  #end(): TemplateResult {
    const { sample } = this.check;
    const of = (fits: (judgement: Judgement) => boolean) => sample.filter(({ judgement }) => judgement !== null && fits(judgement)).length;
    return html`<div class="ask end">
      <h2 tabindex="-1" autofocus>${words.trust.allLookedAt}</h2>
      <p>
        ${words.trust.tally(
          of((said) => said === 'right'),
          of((said) => said === 'wrong' || typeof said === 'object'),
          of((said) => said === 'untold'),
        )}
      </p>
      <p class="soft">${words.trust.allLookedAtHint}</p>
      <div class="row">
        <button class="strong" @click=${() => tell(this, 'state-check', {})}>${words.trust.state} <kbd class="hint">Enter</kbd></button>
      </div>
    </div>`;
  }

  static override styles = [
    ...Panel.styles,
    css`
      dialog {
        width: calc(100vw - 2rem);
        max-width: none;
        height: calc(100dvh - 2rem);
      }
      .inside {
        height: 100%;
        padding: 0.8rem;
      }
      .work {
        display: grid;
        grid-template-columns: minmax(0, 1.2fr) minmax(18rem, 1fr);
        grid-template-rows: auto auto auto minmax(0, 1fr);
        gap: 0.5rem 1.2rem;
        height: 100%;
        min-height: 0;
      }
      .top,
      progress,
      .error {
        grid-column: 1 / -1;
      }
      .error:empty {
        display: none;
      }
      progress {
        width: 100%;
      }
      .figures {
        font-variant-numeric: tabular-nums;
      }
      .mat {
        grid-row: 4;
        display: flex;
        min-height: 0;
        padding: 8px;
        border-radius: 14px;
        background: var(--bright);
      }
      .shown {
        width: 100%;
        height: 100%;
        min-height: 0;
        object-fit: contain;
        border-radius: 8px;
        background: var(--quiet);
      }
      .shown.text {
        padding: 1rem;
        overflow: auto;
        white-space: pre-wrap;
        overflow-wrap: anywhere;
        color: var(--ink);
        background: var(--surface);
        font-size: 1.15rem;
        user-select: text;
      }
      .ask {
        grid-row: 4;
        display: flex;
        flex-direction: column;
        gap: 0.7rem;
        min-height: 0;
        overflow: auto;
        padding: 6px;
      }
      .ask > * {
        flex: none;
      }
      .end {
        grid-column: 1 / -1;
        align-items: start;
      }
      h2 {
        overflow-wrap: anywhere;
      }
      h2:focus {
        outline: none;
      }
      .like {
        display: flex;
        gap: 5px;
      }
      .like:has(.line) {
        flex-direction: column;
        font-size: 0.88rem;
        color: var(--ink-soft);
      }
      .line {
        display: -webkit-box;
        -webkit-box-orient: vertical;
        -webkit-line-clamp: 2;
        overflow: hidden;
        overflow-wrap: anywhere;
      }
      .like img {
        width: 64px;
        height: 64px;
        object-fit: cover;
        border-radius: 7px;
      }
      .right {
        min-height: 56px;
        font-size: 1.15rem;
      }
      .right kbd {
        background: transparent;
        color: inherit;
        border-color: currentColor;
      }
      .trays {
        display: grid;
        grid-template-columns: repeat(auto-fill, minmax(min(10rem, 100%), 1fr));
        gap: 6px;
        list-style: none;
      }
      .trays button {
        display: flex;
        align-items: center;
        gap: 0.45rem;
        width: 100%;
        min-height: 44px;
        text-align: start;
        overflow-wrap: anywhere;
      }
      .ask .row button {
        min-height: 44px;
      }
      @media (max-width: 760px) {
        .work {
          grid-template-columns: minmax(0, 1fr);
          grid-template-rows: auto auto auto minmax(7rem, 1fr) auto;
        }
        .ask {
          grid-row: 5;
          gap: 0.5rem;
          max-height: 60dvh;
        }
        .end {
          max-height: none;
        }
        .head {
          display: flex;
          flex-wrap: wrap;
          align-items: center;
          gap: 0.3rem 0.8rem;
        }
        h2 {
          font-size: 1.2rem;
        }
        .trays button {
          padding-inline: 0.5rem;
        }
        .like img {
          width: 44px;
          height: 44px;
        }
        .trays {
          grid-template-columns: repeat(auto-fill, minmax(min(6.2rem, 100%), 1fr));
        }
      }
    `,
  ];
}

customElements.define('ken-spot-check', SpotCheckPanel);
