import { css, html, LitElement, nothing, type TemplateResult } from 'lit';
import type { Kind } from '../kit/client';
import { fraction } from './fraction';
import { shared } from './styles';
import type { Tally } from './view';
import { words } from './words';

/** The whole pile as one bar: what is answered, sure, unsure, open. */
export class Band extends LitElement {
  static override properties = { tally: { attribute: false }, kind: { attribute: false } };

  declare tally: Tally | undefined;
  declare kind: Kind;

  override render(): TemplateResult | typeof nothing {
    const { tally } = this;
    if (!tally || tally.items === 0) return nothing;
    const parts = (
      [
        ['answered', tally.answered, words.answered],
        ['sure', tally.sure, words.sure],
        ['unsure', tally.unsure, words.unsureCount],
        ['unsorted', tally.unsorted, words.unsorted],
        ['aside', tally.aside, words.asideCount],
      ] as const
    ).filter(([, n]) => n > 0);
    return html`<div class="bar" aria-hidden="true">
        ${parts.map(([kind, n]) => html`<span class=${kind} ${fraction(n / tally.items)}></span>`)}
      </div>
      <p>
        <strong>${words.bandTitle(tally.items, this.kind)}</strong>
        ${parts.map(([kind, n, say]) => html`<span class="part"><span class="swatch ${kind}" aria-hidden="true"></span>${say(n)}</span>`)}
      </p>`;
  }

  static override styles = [
    shared,
    css`
      :host {
        display: block;
      }
      .bar {
        display: flex;
        gap: 2px;
        height: 14px;
        border-radius: 5px;
        overflow: hidden;
        forced-color-adjust: none;
      }
      .bar span {
        flex: 0 0 calc(var(--fraction) * 100%);
      }
      @media (prefers-reduced-motion: no-preference) {
        .bar span {
          transition: flex-basis 0.25s ease-out;
        }
      }
      .answered {
        background: var(--ink);
      }
      .sure {
        background: var(--edge);
      }
      .unsure {
        background: repeating-linear-gradient(115deg, var(--edge) 0 3px, var(--raised) 3px 8px);
      }
      .unsorted {
        background: var(--raised);
        box-shadow: inset 0 0 0 1.5px var(--line);
      }
      .aside {
        background: radial-gradient(circle, var(--ink) 1.6px, transparent 1.9px) 0 0 / 6px 7px var(--raised);
      }
      p {
        display: flex;
        flex-wrap: wrap;
        gap: 0 1.1rem;
        margin-top: 5px;
        font-size: 0.92rem;
        font-variant-numeric: tabular-nums;
      }
      .part {
        display: inline-flex;
        align-items: center;
        gap: 0.4rem;
      }
      .swatch {
        width: 18px;
        height: 11px;
        border-radius: 3px;
        forced-color-adjust: none;
      }
    `,
  ];
}

customElements.define('ken-band', Band);
