import { css, html, LitElement, type PropertyValues, type TemplateResult } from 'lit';
import type { Outlook } from '../kit/client';
import { shared } from './styles';
import { words } from './words';

/** Said aloud only after so long without another answer, in milliseconds: whoever answers fast is not talked over. */
const QUIET = 2500;

/** One calm line: how much is sorted right by now, and what ten more answers would bring. */
export class OutlookLine extends LitElement {
  static override properties = { outlook: { attribute: false }, open: { type: Boolean }, spoken: { state: true } };

  declare outlook: Outlook | undefined;
  /** Whether there are items without an answer. */
  declare open: boolean;
  declare spoken: string;
  #timer: ReturnType<typeof setTimeout> | undefined;

  constructor() {
    super();
    this.open = false;
    this.spoken = '';
  }

  get #text(): string {
    const { outlook } = this;
    if (!outlook) return this.open ? words.outlookUnknown : words.outlookNone;
    const { now, afterTenMore } = outlook;
    return `${words.outlook}: ${words.outlookNow(now.expected, now.low, now.high).join('')} ${words.outlookThen(afterTenMore.expected)}.`;
  }

  override updated(changed: PropertyValues<this>): void {
    if (!changed.has('outlook') && !changed.has('open')) return;
    clearTimeout(this.#timer);
    // The first one is read with the page.
    if (changed.get('open') !== undefined || changed.get('outlook')) this.#timer = setTimeout(() => (this.spoken = this.#text), QUIET);
  }

  override disconnectedCallback(): void {
    super.disconnectedCallback();
    clearTimeout(this.#timer);
  }

  override render(): TemplateResult {
    const { outlook } = this;
    const said = html`<span class="visually-hidden" aria-live="polite">${this.spoken}</span>`;
    if (!outlook) return html`<p>${this.#text}</p>${said}`;
    const { now, afterTenMore } = outlook;
    const [share, what] = words.outlookNow(now.expected, now.low, now.high);
    return html`<p title=${words.outlookTitle}>
        <span><strong>${share}</strong>${what}</span> <span>${words.outlookThen(afterTenMore.expected)}</span>
      </p>
      ${said}`;
  }

  static override styles = [
    shared,
    css`
      :host {
        display: block;
      }
      p {
        font-size: 0.88rem;
        color: var(--ink-soft);
        font-variant-numeric: tabular-nums;
      }
      strong {
        color: var(--ink);
      }
      p > span {
        display: inline-block;
      }
    `,
  ];
}

customElements.define('ken-outlook', OutlookLine);
