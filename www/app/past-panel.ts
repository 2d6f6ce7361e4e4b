import { css, html, nothing, type TemplateResult } from 'lit';
import { kindOf, NOTHING, type PastPile, type StarterFacts } from '../kit/client';
import { tell } from './event';
import { Panel } from './panels';
import type { NextView, PastView, PileView } from './past';
import { words } from './words';

/** Learning from the pile, what the next one starts from, and what is kept of past ones. */
export class PastPanel extends Panel {
  static override properties = { view: { attribute: false }, forgetting: { state: true } };

  declare view: PastView;
  /** What would be forgotten for good by one more press: a pile, or `all`. */
  declare forgetting: string | undefined;
  protected readonly label = words.pastTitle;

  protected content(): TemplateResult {
    const { pile, next, piles, problem, said } = this.view;
    return html`<div class="row top">
        <h2>${words.pastTitle}</h2>
        <button autofocus @click=${() => this.close()}>${words.close}</button>
      </div>
      <p>${words.pastWhat}</p>
      <div class="news">
        <p class="error" role="alert">${problem}</p>
        <p role="status">${said}</p>
      </div>
      ${pile ? this.#pile(pile) : this.view.learning === undefined ? nothing : this.#learning(this.view.learning)}
      <section aria-labelledby="next">
        <h3 id="next">${words.nextTitle}</h3>
        ${next.some(({ starters }) => starters.length > 0)
          ? next.map((one) => this.#next(one))
          : html`<p class="soft">${words.nextNothing}</p>`}
        <div class="row">
          <button @click=${() => tell(this, 'choose-starter', {})}>${words.openStarter}</button>
          <span class="soft hint">${words.openStarterHint[0]} <span class="drop">${words.openStarterHint[1]}</span></span>
        </div>
      </section>
      <section aria-labelledby="kept">
        <h3 id="kept">${words.keptTitle}</h3>
        <p class="soft">${words.kept}</p>
        <ul>
          ${piles.map((one) => this.#past(one))}
        </ul>
        ${piles.length === 0 && next.length === 0 ? html`<p>${words.keptNothing}</p>` : this.#forgetAll()}
      </section>`;
  }

  #pile(pile: PileView): TemplateResult {
    const { answers, trays, teachable, taught, starter, offer } = pile;
    const { learning } = this.view;
    return html`<section aria-labelledby="this">
      <h3 id="this">${words.pastThis}</h3>
      ${starter
        ? html`<div class="row">
            <span>${starter.on ? words.startsFrom(starter.name, starter.categories) : words.startsOff}</span>
            <button @click=${() => tell(this, 'start-from', { to: !starter.on })}>${starter.on ? words.switchOff : words.switchOn}</button>
          </div>`
        : nothing}
      ${offer
        ? html`<div class="row">
            <button @click=${() => tell(this, 'start-from', { to: offer.key })}>${words.useHere(offer.name)}</button>
          </div>`
        : nothing}
      ${learning === undefined
        ? html`<p>${teachable ? (taught ? words.taught(taught.items, answers) : words.canTeach(answers, trays)) : words.tooLittle}</p>
            ${teachable && taught?.items !== answers
              ? html`<div class="row">
                  <button class="strong" @click=${() => tell(this, 'learn', {})}>${taught ? words.learnAgain : words.learn}</button>
                </div>`
              : nothing}`
        : this.#learning(learning)}
    </section>`;
  }

  #learning(learning: number): TemplateResult {
    return html`<div class="row">
      <progress aria-label=${words.learningShort} max="1" .value=${learning}></progress>
      <span class="figures">${words.learning(learning)}</span>
      <button @click=${() => tell(this, 'stop-learning', {})}>${words.stop}</button>
    </div>`;
  }

  #next({ encoder, starters, chosen }: NextView): TemplateResult {
    const option = (key: string, text: unknown, more: unknown): TemplateResult => html`<div class="row option">
      <label class="check">
        <input
          type="radio"
          name="next ${encoder}"
          .checked=${key === chosen}
          @change=${() => tell(this, 'past-next', { encoder, key })}
        />
        <span>${text}</span>
      </label>
      ${more}
    </div>`;
    const button = (starter: StarterFacts): TemplateResult =>
      starter.name === undefined
        ? html`<button @click=${() => tell(this, 'share-starter', { starter })}>${words.saveStarter}</button>`
        : html`<button aria-label=${words.deleteStarter(starter.name)} @click=${() => tell(this, 'drop-starter', { key: starter.key })}>
            ${words.delete}
          </button>`;
    return html`<h4>${words.nextOf(kindOf(encoder))}</h4>
      <div role="radiogroup" aria-label=${words.nextOf(kindOf(encoder))}>
      ${starters.map((starter) => {
        const facts = words.starterFacts(starter.name, starter.categories, starter.items, starter.piles.length, starter.date);
        return option(starter.key, html`<b>${starter.name ?? words.ownStarter}</b> <span class="soft">${facts}</span>`, button(starter));
      })}
      ${option(NOTHING, words.nothing, nothing)}
    </div>`;
  }

  #past({ id, date, encoder, categories, items }: PastPile): TemplateResult {
    return html`<li class="row">
      <span>${words.pastPile(kindOf(encoder), date, categories, items)}</span>
      ${this.#forget(id, words.forgetPile(date), words.forget, () => tell(this, 'forget-pile', { id }))}
    </li>`;
  }

  #forgetAll(): TemplateResult {
    return html`<div class="row">${this.#forget('all', words.forgetAll, words.forgetAll, () => tell(this, 'forget-all', {}))}</div>`;
  }

  /** A second press of the same button, since it can't be undone. */
  #forget(what: string, label: string, text: string, act: () => void): TemplateResult {
    const sure = this.forgetting === what;
    return html`<button
      class=${sure ? 'alarm' : ''}
      aria-label=${sure ? nothing : label}
      ?disabled=${this.view.learning !== undefined}
      @click=${() => {
        if (sure) act();
        this.forgetting = sure ? undefined : what;
      }}
      @blur=${() => (this.forgetting = undefined)}
    >
      ${sure ? words.forgetSure : text}
    </button>`;
  }

  static override styles = [
    ...Panel.styles,
    css`
      .inside {
        width: min(40rem, calc(100vw - 2rem));
      }
      section {
        display: grid;
        gap: 0.6rem;
        padding-top: 0.9rem;
        border-top: 1px solid var(--line);
      }
      h3 {
        margin: 0;
      }
      .row > :first-child {
        min-width: 0;
      }
      .option {
        justify-content: space-between;
        gap: 0 0.6rem;
      }
      .option button {
        flex: none;
      }
      .check {
        flex: 1 1 16rem;
        overflow-wrap: anywhere;
      }
      .check input {
        flex: none;
      }
      .news:not(:has(p:not(:empty))) {
        display: none;
      }
      .news p {
        font-weight: 600;
      }
      ul {
        display: grid;
        gap: 0.3rem;
        list-style: none;
      }
      li.row {
        justify-content: space-between;
      }
      .hint {
        flex: 1 1 14rem;
      }
      @media (hover: none) {
        .drop {
          display: none;
        }
      }
      .figures {
        font-variant-numeric: tabular-nums;
      }
      progress {
        flex: 1 1 8rem;
      }
    `,
  ];
}

customElements.define('ken-past-panel', PastPanel);
