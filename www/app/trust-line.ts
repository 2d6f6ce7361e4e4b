import { css, html, LitElement, nothing, type TemplateResult } from 'lit';
import type { CheckView, Trust } from '../kit/client';
import { tell } from './event';
import { shared } from './styles';
import { plotStyles, shareBar } from './trust-plots';
import { words } from './words';

/** One calm line: how sure the sorting is, and the way to all that can be said of it. */
export class TrustLine extends LitElement {
  static override properties = { known: { attribute: false }, check: { attribute: false } };

  declare known: Trust | undefined;
  declare check: CheckView | undefined;

  override render(): TemplateResult {
    const share = this.known?.assessment?.share;
    const doubts = this.known?.doubts.length ?? 0;
    // A sentence that can be signed needs no other beside it.
    const judged = share && share.value !== null && !this.check ? share : undefined;
    return html`<section aria-label=${words.trust.title}>
      ${judged ? html`<span class="bar">${shareBar(judged)}</span>` : nothing}
      <span>${this.#text()}</span>
      ${doubts > 0 ? html`<span class="doubts">${words.trust.lineDoubts(doubts)}</span>` : nothing}
      <button class="plain" @click=${() => tell(this, 'trust', {})}>${words.trust.open} <kbd class="hint">H</kbd></button>
    </section>`;
  }

  #text(): string {
    const { check } = this;
    if (check && !check.statement) return words.trust.lineCheck(check.sample.length - check.left, check.sample.length);
    if (check?.statement && check.aboutNow) return check.statement.sentence;
    const share = this.known?.assessment?.share;
    if (!share || share.value === null) return '';
    return words.trust.line(share.right, share.judged, share.wilson.low, share.wilson.high);
  }

  static override styles = [
    shared,
    plotStyles,
    css`
      :host {
        display: block;
      }
      section {
        display: flex;
        flex-wrap: wrap;
        align-items: center;
        gap: 0 0.8rem;
        color: var(--ink-soft);
        font-size: 0.94rem;
        font-variant-numeric: tabular-nums;
      }
      .bar {
        flex: 0 0 7rem;
      }
      .doubts {
        padding: 0 0.4em;
        border: 1px dashed var(--edge);
        border-radius: 6px;
        white-space: nowrap;
      }
      .plain {
        padding-inline: 0.4rem;
        margin-inline: -0.4rem;
        color: var(--ink);
        text-decoration: underline;
        text-underline-offset: 3px;
      }
    `,
  ];
}

customElements.define('ken-trust-line', TrustLine);
