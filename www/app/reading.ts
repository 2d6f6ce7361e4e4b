import { css, html, LitElement, nothing, type TemplateResult } from 'lit';
import type { Fetched, Kind, Progress } from '../kit/client';
import { tell } from './event';
import { shared } from './styles';
import { words } from './words';

/** How reading goes, what could not be read, and other things that the person has to know. */
export class Reading extends LitElement {
  static override properties = {
    kind: { attribute: false },
    progress: { attribute: false },
    fetched: { attribute: false },
    problems: { attribute: false },
    stopping: { type: Boolean },
  };

  declare kind: Kind;
  declare progress: Progress | undefined;
  declare fetched: Fetched | undefined;
  declare problems: readonly string[];
  declare stopping: boolean;

  constructor() {
    super();
    this.kind = 'photos';
    this.problems = [];
    this.stopping = false;
  }

  override render(): TemplateResult {
    return html`<section aria-label=${words.news}>
      ${this.#reading()} ${this.#outcome()}
      <div role="alert">
        ${this.problems.map(
          (problem) => html`<p class="line problem">
            <span>${problem}</span>
            <button class="plain" @click=${() => tell(this, 'dismiss', { problem })}>${words.dismiss}</button>
          </p>`,
        )}
      </div>
    </section>`;
  }

  #reading(): TemplateResult | typeof nothing {
    const { progress, fetched, kind } = this;
    if (!progress || progress.state === 'finished') return nothing;
    const { done, total } = progress;
    if (fetched) {
      return html`<div class="line">
        <progress aria-label=${words.fetchingShort} max=${fetched.total} .value=${fetched.done}></progress>
        <span class="figures">${words.fetching(fetched.done, fetched.total)}</span>
        <button ?disabled=${this.stopping} @click=${() => tell(this, 'stop', {})}>${words.stop}</button>
      </div>`;
    }
    if (progress.state === 'stopped' && !this.stopping) {
      return html`<div class="line">
        <span>${words.stopped(done, total)}</span>
        <button @click=${() => tell(this, 'go-on', {})}>${words.goOn}</button>
      </div>`;
    }
    return html`<div class="line">
      <progress aria-label=${words.readingShort(kind)} max=${total} .value=${done}></progress>
      <span class="figures">${this.stopping ? words.stopping(kind) : words.reading(kind, done, total, progress.secondsLeft)}</span>
      <button ?disabled=${this.stopping} @click=${() => tell(this, 'stop', {})}>${words.stop}</button>
    </div>`;
  }

  #outcome(): TemplateResult | typeof nothing {
    const { progress } = this;
    if (!progress || (progress.refused.length === 0 && progress.duplicates.length === 0)) return nothing;
    const { refused, duplicates } = progress;
    return html`<div class="line problem" role="status">
      <div class="outcome">
        ${refused.length > 0
          ? html`<details ?open=${refused.length <= 5}>
              <summary>${words.refused(this.kind, refused.length)}</summary>
              <ul>
                ${refused.map(({ name, message }) => html`<li>${message.includes(name) ? message : `${name}: ${message}`}</li>`)}
              </ul>
            </details>`
          : nothing}
        ${duplicates.length > 0 ? html`<p class="duplicates">${words.duplicates(this.kind, [...duplicates])}</p>` : nothing}
      </div>
      ${progress.state === 'finished'
        ? html`<button class="plain" @click=${() => tell(this, 'dismiss-outcome', {})}>${words.dismiss}</button>`
        : nothing}
    </div>`;
  }

  static override styles = [
    shared,
    css`
      :host {
        display: block;
      }
      .line {
        display: flex;
        flex-wrap: wrap;
        align-items: center;
        gap: 0.4rem 0.9rem;
        margin-bottom: 10px;
        padding: 6px 8px 6px 14px;
        border-radius: var(--radius);
        background: var(--surface);
      }
      .line > :not(button):not(progress) {
        flex: 1 1 16rem;
        min-width: 0;
      }
      .problem {
        border: 1.5px solid var(--edge);
        align-items: start;
      }
      .problem > :first-child {
        padding-block: 6px;
      }
      .figures {
        font-variant-numeric: tabular-nums;
      }
      progress {
        flex: 1 1 10rem;
      }
      summary {
        cursor: pointer;
        font-weight: 600;
      }
      ul {
        padding-inline-start: 1.2rem;
        max-height: 30vh;
        overflow: auto;
      }
      li,
      .duplicates {
        overflow-wrap: anywhere;
      }
    `,
  ];
}

customElements.define('ken-reading', Reading);
