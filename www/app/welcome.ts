import { css, html, LitElement, type TemplateResult } from 'lit';
import type { Kind, Kit } from '../kit/client';
import { tell } from './event';
import { demoIndex, demoUrl } from './files';
import './kits-panel';
import { shared } from './styles';
import { words } from './words';

const HEAP = 36;

/** The empty page: what it is for, and the ways to begin. */
export class Welcome extends LitElement {
  static override properties = {
    ready: { type: Boolean },
    loading: { attribute: false },
    hasCamera: { type: Boolean },
    kits: { attribute: false },
    heap: { state: true },
  };

  declare ready: boolean;
  /** The demo pile that is being fetched. */
  declare loading: Kind | undefined;
  declare hasCamera: boolean;
  declare kits: readonly Kit[];
  declare heap: string[];

  constructor() {
    super();
    this.ready = false;
    this.hasCamera = false;
    this.kits = [];
    this.heap = [];
  }

  override firstUpdated(): void {
    void this.#fetchHeap();
  }

  async #fetchHeap(): Promise<void> {
    // Without the pictures the page says the same in words.
    const index = await demoIndex().catch(() => undefined);
    if (!index) return;
    const step = Math.max(1, Math.floor(index.items.length / HEAP));
    this.heap = index.items
      .filter((_, at) => at % step === 0)
      .slice(0, HEAP)
      .map(({ file }) => demoUrl(file));
  }

  override render(): TemplateResult {
    return html`<main>
      <div class="say">
        <h1>${words.promise.map((line) => html`<span>${line}</span> `)}</h1>
        <p class="job">${words.job}</p>
        <div class="row first">
          <button class="bright big" ?disabled=${this.loading !== undefined} @click=${() => tell(this, 'demo', {})}>
            ${this.loading === 'photos' ? words.demoLoading : words.demo}
          </button>
          <button class="big" ?disabled=${this.loading !== undefined} @click=${() => tell(this, 'demo-notes', {})}>
            ${this.loading === 'notes' ? words.demoNotesLoading : words.demoNotes}
          </button>
        </div>
        <div class="row">
          <button class="strong" @click=${() => tell(this, 'choose-files', {})}>${words.chooseFiles}</button>
          <button @click=${() => tell(this, 'choose-folder', {})}>${words.chooseFolder}</button>
          ${this.hasCamera ? html`<button @click=${() => tell(this, 'camera', {})}>${words.camera}</button>` : null}
        </div>
        <div class="row">
          <button class="strong" @click=${() => tell(this, 'choose-notes', {})}>${words.chooseNotes}</button>
          <button @click=${() => tell(this, 'write-notes', {})}>${words.writeNotes}</button>
        </div>
        <p class="soft drop">${words.dropHint}</p>
        <slot></slot>
        <ken-kit-list .kits=${this.kits}></ken-kit-list>
        <p class="private"><strong>${words.private}</strong> ${words.privateLong}</p>
      </div>
      <div class="heap" aria-hidden="true" @click=${() => tell(this, 'demo', {})}>
        ${this.heap.map((url) => html`<img src=${url} alt="" loading="lazy" />`)}
      </div>
    </main>`;
  }

  static override styles = [
    shared,
    css`
      main {
        display: grid;
        grid-template-columns: minmax(0, 1fr) minmax(0, 1fr);
        gap: clamp(1.5rem, 5vw, 5rem);
        align-items: center;
        max-width: 1240px;
        margin: 0 auto;
        padding: clamp(1.2rem, 5vh, 4.5rem) clamp(1rem, 4vw, 3rem);
      }
      .say {
        display: grid;
        gap: 1.1rem;
        justify-items: start;
      }
      h1 {
        font-size: clamp(2rem, 4vw, 3.4rem);
        line-height: 1.06;
        letter-spacing: -0.02em;
        text-wrap: balance;
      }
      h1 span {
        display: block;
      }
      .job {
        font-size: 1.16rem;
        max-width: 34em;
        text-wrap: pretty;
      }
      .big {
        min-height: 54px;
        padding-inline: 1.4rem;
        font-size: 1.1rem;
      }
      .private {
        max-width: 34em;
        padding-inline-start: 0.9rem;
        border-inline-start: 4px solid var(--edge);
      }
      .heap {
        display: grid;
        grid-template-columns: repeat(6, minmax(0, 1fr));
        min-height: 200px;
        cursor: pointer;
      }
      .heap img {
        width: 122%;
        aspect-ratio: 1;
        object-fit: cover;
        border: 3px solid var(--raised);
        border-radius: 8px;
        box-shadow: 0 2px 6px rgb(0 0 0 / 0.22);
        rotate: -5deg;
      }
      .heap img:nth-child(3n) {
        rotate: 7deg;
        translate: -4% 6%;
      }
      .heap img:nth-child(5n + 1) {
        rotate: -11deg;
        translate: 5% -7%;
      }
      .heap img:nth-child(7n + 3) {
        rotate: 3deg;
        translate: -8% -4%;
      }
      .heap img:nth-child(15) {
        z-index: 1;
        rotate: -3deg;
        scale: 1.5;
        border: 7px solid var(--bright);
      }
      @media (max-width: 820px) {
        main {
          grid-template-columns: minmax(0, 1fr);
        }
        .heap {
          order: -1;
          grid-template-columns: repeat(9, minmax(0, 1fr));
          min-height: 0;
          padding-inline-end: 8px;
        }
        .heap img {
          border-width: 2px;
        }
        .heap img:nth-child(15) {
          scale: 1.7;
          border-width: 3px;
        }
        .heap img:nth-child(n + 19) {
          display: none;
        }
        main {
          gap: 1.8rem;
        }
      }
      @media (hover: none) {
        .drop {
          display: none;
        }
      }
    `,
  ];
}

customElements.define('ken-welcome', Welcome);
