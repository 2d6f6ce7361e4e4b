import { css, html, LitElement, nothing, type TemplateResult } from 'lit';
import { kindOf, NOTHING } from '../kit/client';
import { tell } from './event';
import type { PastView } from './past';
import { shared } from './styles';
import { words } from './words';

/** One calm line: what the pile starts from, that it is being learned from, or the offer to. */
export class StarterLine extends LitElement {
  static override properties = { view: { attribute: false } };

  declare view: PastView;

  override render(): TemplateResult | typeof nothing {
    const { pile, learning, offered } = this.view;
    if (learning !== undefined) {
      return this.#line(
        html`<progress aria-label=${words.learningShort} max="1" .value=${learning}></progress>
          <span class="figures">${words.learning(learning)}</span>`,
        html`<button @click=${() => tell(this, 'stop-learning', {})}>${words.stop}</button>`,
      );
    }
    if (!pile) return this.#next();
    if (offered) {
      return this.#line(
        html`<span>${words.learnOffer}</span>`,
        html`<button @click=${() => tell(this, 'learn', {})}>${words.learn}</button>`,
        this.#more(),
      );
    }
    const { starter } = pile;
    if (!starter) return nothing;
    return this.#line(
      html`<span>${starter.on ? words.startsFrom(starter.name, starter.categories) : words.startsOff}</span>`,
      html`<button class="plain" @click=${() => tell(this, 'start-from', { to: !starter.on })}>
        ${starter.on ? words.switchOff : words.switchOn}
      </button>`,
      this.#more(),
    );
  }

  /** Before there is a pile. */
  #next(): TemplateResult | typeof nothing {
    const [next] = this.view.next.flatMap(({ starters, chosen }) =>
      chosen === NOTHING ? [] : starters.filter(({ key }) => key === chosen),
    );
    if (!next) return nothing;
    return this.#line(html`<span>${words.nextStartsFrom(kindOf(next.encoder), next.name, next.categories)}</span>`, this.#more());
  }

  #more(): TemplateResult {
    return html`<button class="plain" @click=${() => tell(this, 'past', {})}>${words.past}</button>`;
  }

  #line(...parts: TemplateResult[]): TemplateResult {
    return html`<section aria-label=${words.past}>${parts}</section>`;
  }

  static override styles = [
    shared,
    css`
      :host {
        display: block;
      }
      section {
        display: flex;
        flex-wrap: wrap;
        align-items: center;
        gap: 0 1.2rem;
        color: var(--ink-soft);
        font-size: 0.94rem;
      }
      section:has(progress) {
        gap: 0.4rem 0.9rem;
      }
      .plain {
        padding-inline: 0.4rem;
        margin-inline: -0.4rem;
        color: var(--ink);
        text-decoration: underline;
        text-underline-offset: 3px;
      }
      .figures {
        font-variant-numeric: tabular-nums;
      }
      progress {
        flex: 1 1 8rem;
        max-width: 24rem;
      }
    `,
  ];
}

customElements.define('ken-starter-line', StarterLine);
