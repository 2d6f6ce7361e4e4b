import { html, nothing, type PropertyValues, type TemplateResult } from 'lit';
import { repeat } from 'lit/directives/repeat.js';
import { type Assessment, type Doubt, type Item, type Share, Status, type Terms } from '../kit/client';
import { tell } from './event';
import { Panel } from './panels';
import { boundBar, calibrationPlot, curvePlot, plotStyles, shareBar } from './trust-plots';
import { trustStyles } from './trust-styles';
import type { TrustTab, TrustView } from './trust';
import { percent, words } from './words';

const TABS: readonly TrustTab[] = ['sure', 'doubts', 'check'];
const TARGETS = [0.8, 0.9, 0.95, 0.98, 0.99];
const CONFIDENCES = [0.8, 0.9, 0.95, 0.99];
const ASIDE_SHARES = [0, 0.01, 0.02, 0.05, 0.1, 0.2];
const TOLERANCES = [0.01, 0.02, 0.03, 0.05, 0.1];
const CHECK_CONFIDENCES = [0.9, 0.95, 0.99];
const ALLOWED = [0, 1, 2, 3, 5];
/** Pictures beside each other for a tray. */
const EXAMPLES = 3;
const CONFUSED = 6;
/** Characters of a note that name it. */
const NAMED = 80;

/** How far the sorting can be relied on: in pictures first, with the same in words. */
export class TrustPanel extends Panel {
  static override properties = {
    view: { attribute: false },
    items: { attribute: false },
    pictureOf: { attribute: false },
    singleKeys: { type: Boolean },
  };

  declare view: TrustView;
  declare items: readonly Item[];
  /** The address of an item's small picture. */
  declare pictureOf: (item: number) => string | undefined;
  declare singleKeys: boolean;
  protected readonly label = words.trust.title;
  /** The place in the list of the doubt that was settled just now. */
  #settled: number | undefined;

  constructor() {
    super();
    this.addEventListener('keydown', this.#onDoubtKey);
  }

  protected content(): TemplateResult {
    const { tab, known, said, problem } = this.view;
    return html`<div class="row top">
        <h2>${words.trust.title}</h2>
        <button @click=${() => this.close()}>${words.close}</button>
      </div>
      <div class="tabs" role="tablist" aria-label=${words.trust.title} @keydown=${this.#onTabKey}>
        ${TABS.map(
          (one) => html`<button
            role="tab"
            id="tab-${one}"
            aria-controls="sheet"
            aria-selected=${one === tab ? 'true' : 'false'}
            tabindex=${one === tab ? 0 : -1}
            ?autofocus=${one === tab}
            @click=${() => tell(this, 'trust-tab', { tab: one })}
          >
            ${words.trust.tabs[one]}${one === 'doubts' && known ? html` <span class="number">${known.doubts.length}</span>` : nothing}
          </button>`,
        )}
      </div>
      <div class="news">
        <p class="error" role="alert">${problem}</p>
        <p role="status">${said}</p>
      </div>
      <div id="sheet" class="sheet" role="tabpanel" aria-labelledby="tab-${tab}">
        ${tab === 'sure' ? this.#sure() : tab === 'doubts' ? this.#doubts() : this.#check()}
      </div>`;
  }

  #onTabKey(event: KeyboardEvent): void {
    const step = event.key === 'ArrowRight' ? 1 : event.key === 'ArrowLeft' ? -1 : 0;
    if (step === 0) return;
    event.preventDefault();
    const way = getComputedStyle(this).direction === 'rtl' ? -step : step;
    const next = TABS[(TABS.indexOf(this.view.tab) + way + TABS.length) % TABS.length];
    if (!next) return;
    tell(this, 'trust-tab', { tab: next });
    void this.updateComplete.then(() => this.renderRoot.querySelector<HTMLElement>(`#tab-${next}`)?.focus());
  }

  #name(tray: number): string {
    return this.view.snapshot.trays.find((one) => one.tray === tray)?.name ?? '';
  }

  /** What an item is called: a note by how it begins. */
  #itemName(item: number): string {
    const of = this.items[item];
    if (!of) return '';
    return 'text' in of && of.text.length > NAMED ? `${of.text.slice(0, NAMED).trimEnd()} …` : 'text' in of ? of.text : of.name;
  }

  /** A small picture of an item, or its text. */
  #picture(item: number): TemplateResult {
    const of = this.items[item];
    const url = this.pictureOf(item);
    if (url) return html`<img src=${url} alt=${of?.name ?? ''} loading="lazy" decoding="async" />`;
    return html`<span class="text" dir="auto">${of && 'text' in of ? of.text : of?.name}</span>`;
  }

  /** The same as a button that takes the item in hand. */
  #taking(item: number): TemplateResult {
    const name = this.#itemName(item);
    return html`<button class="tile" aria-label=${words.trust.take(name)} title=${name} @click=${() => tell(this, 'take-out', { item })}>
      ${this.#picture(item)}
    </button>`;
  }

  /** How many items have no answer yet. */
  get #left(): number {
    return this.view.snapshot.verdicts.status.filter((status) => status === Status.sorted || status === Status.skipped).length;
  }

  /** What the person put into a tray, other than `except`. */
  #examples(tray: number, except: readonly number[]): number[] {
    const { status, tray: trays } = this.view.snapshot.verdicts;
    const found: number[] = [];
    for (let item = 0; item < status.length && found.length < EXAMPLES; item++) {
      if (status[item] === Status.answered && trays[item] === tray && !except.includes(item)) found.push(item);
    }
    return found;
  }

  // How sure

  #sure(): TemplateResult {
    const { known } = this.view;
    if (!known) return html`<p class="soft">${words.trust.reckoning}</p>`;
    const { assessment } = known;
    if (!assessment) return html`<p>${words.trust.tooFew}</p>${this.#terms()}`;
    return html`${this.#overall(assessment)} ${this.#confused(assessment)}
      <div class="plots">${this.#ahead(assessment)} ${this.#calibration(assessment)}</div>
      ${this.#terms()}`;
  }

  #overall({ share, trays, answers }: Assessment): TemplateResult {
    return html`<section aria-labelledby="overall">
      <h3 id="overall">${words.trust.overall}</h3>
      ${share.value === null
        ? html`<p>${words.trust.notYet(answers)}</p>`
        : html`<p class="big">
              <strong>${percent(share.value)}</strong>
              <span>${words.trust.shareWords(share.right, share.judged, share.wilson.low, share.wilson.high)}</span>
            </p>
            ${shareBar(share)}`}
      <p class="soft">${words.trust.overallHow}</p>
      <table>
        <caption class="visually-hidden">
          ${words.trust.byTray}
        </caption>
        <thead class="visually-hidden">
          <tr>
            <th scope="col">${words.trust.tray}</th>
            <th scope="col">${words.trust.share}</th>
          </tr>
        </thead>
        <tbody>
          ${trays.map(
            (one) => html`<tr>
              <th scope="row">${this.#name(one.tray)}</th>
              <td>${shareBar(one.share)}<span class="figures">${this.#shareText(one.share, one.answers)}</span></td>
            </tr>`,
          )}
        </tbody>
      </table>
    </section>`;
  }

  #shareText(share: Share, answers: number): string {
    if (share.value === null) return answers === 1 ? words.trust.single : words.trust.notJudged;
    return words.trust.shareShort(share.right, share.judged, share.wilson.low, share.wilson.high);
  }

  #confused({ confusions, share }: Assessment): TemplateResult | typeof nothing {
    if (share.value === null) return nothing;
    return html`<section aria-labelledby="confused">
      <h3 id="confused">${words.trust.confused}</h3>
      ${confusions.length === 0
        ? html`<p>${words.trust.nothingConfused}</p>`
        : html`<ul class="pairs">
            ${confusions.map(
              ({ tray, takenFor, items }) => html`<li>
                <p>${words.trust.takenFor(items.length, this.#name(tray), this.#name(takenFor))}</p>
                <div class="pair">
                  <div class="strip">${items.slice(0, CONFUSED).map((item) => this.#taking(item))}</div>
                  <svg class="arrow" viewBox="0 0 30 20" aria-hidden="true"><path d="M 2 10 H 26 M 18 3 L 26 10 L 18 17" /></svg>
                  <div class="strip like">
                    <span class="soft">${words.trust.looksLike(this.#name(takenFor))}</span>
                    ${this.#examples(takenFor, items).map((item) => this.#picture(item))}
                  </div>
                </div>
              </li>`,
            )}
          </ul>`}
    </section>`;
  }

  #ahead({ curve }: Assessment): TemplateResult {
    const { known, target } = this.view;
    const projection = known?.projection;
    return html`<section aria-labelledby="ahead">
      <h3 id="ahead">${words.trust.ahead}</h3>
      ${curve
        ? html`<div class="row">
              <label for="target">${words.trust.target}</label>
              <select id="target" @change=${(event: Event) => tell(this, 'trust-target', { target: Number((event.target as HTMLSelectElement).value) })}>
                ${TARGETS.map((one) => html`<option value=${one} ?selected=${one === target}>${percent(one)}</option>`)}
              </select>
            </div>
            <p>${projection ? words.trust.projection(projection, this.#left) : ''}</p>
            ${curvePlot(curve, target, projection)}
            <p class="soft">${words.trust.aheadHow}</p>
            <details>
              <summary>${words.trust.asTable}</summary>
              <table class="numbers">
                <caption class="visually-hidden">
                  ${words.trust.ahead}
                </caption>
                <thead>
                  <tr>
                    <th scope="col">${words.trust.moreAnswers}</th>
                    <th scope="col">${words.trust.likely}</th>
                    <th scope="col">${words.trust.possible}</th>
                  </tr>
                </thead>
                <tbody>
                  ${curve.ahead.map(
                    ({ more, low, likely, high }) => html`<tr>
                      <th scope="row">${more === 0 ? words.trust.now : `+${Math.round(more)}`}</th>
                      <td>${percent(likely)}</td>
                      <td>${words.trust.range(low, high)}</td>
                    </tr>`,
                  )}
                </tbody>
              </table>
            </details>`
        : html`<p>${words.trust.noCurve}</p>`}
    </section>`;
  }

  #calibration({ calibration }: Assessment): TemplateResult | typeof nothing {
    if (!calibration) return nothing;
    return html`<section aria-labelledby="calibration">
      <h3 id="calibration">${words.trust.calibration}</h3>
      <p>${words.trust.calibrationError(calibration.error)}</p>
      ${calibrationPlot(calibration)}
      <p class="soft">${words.trust.calibrationHow}</p>
      <details>
        <summary>${words.trust.asTable}</summary>
        <table class="numbers">
          <caption class="visually-hidden">
            ${words.trust.calibration}
          </caption>
          <thead>
            <tr>
              <th scope="col">${words.trust.said}</th>
              <th scope="col">${words.trust.answersColumn}</th>
              <th scope="col">${words.trust.came}</th>
              <th scope="col">${words.trust.possible}</th>
            </tr>
          </thead>
          <tbody>
            ${calibration.bins.map(
              ({ said, items, right, wilson }) => html`<tr>
                <th scope="row">${percent(said)}</th>
                <td>${items}</td>
                <td>${percent(right)}</td>
                <td>${words.trust.range(wilson.low, wilson.high)}</td>
              </tr>`,
            )}
          </tbody>
        </table>
        <p>${words.trust.scores(calibration.brier, calibration.logLoss)}</p>
      </details>
    </section>`;
  }

  #terms(): TemplateResult {
    const { terms } = this.view.snapshot;
    const change = (changed: Partial<Terms>) => tell(this, 'terms', { changed });
    const options = (shares: readonly number[], now: number) =>
      [...new Set([...shares, now])].sort((a, b) => a - b).map((one) => html`<option value=${one} ?selected=${one === now}>${percent(one)}</option>`);
    return html`<section aria-labelledby="terms">
      <h3 id="terms">${words.trust.terms}</h3>
      <div class="field">
        <label for="confidence">${words.trust.confidence}</label>
        <select id="confidence" aria-describedby="confidence-hint" @change=${(event: Event) => change({ confidence: Number((event.target as HTMLSelectElement).value) })}>
          ${options(CONFIDENCES, terms.confidence)}
        </select>
        <p id="confidence-hint" class="soft">${words.trust.confidenceHint(terms.confidence)}</p>
      </div>
      <div class="field">
        <label for="aside">${words.trust.asideShare}</label>
        <select id="aside" aria-describedby="aside-hint" @change=${(event: Event) => change({ setAsideShare: Number((event.target as HTMLSelectElement).value) })}>
          ${options(ASIDE_SHARES, terms.setAsideShare)}
        </select>
        <p id="aside-hint" class="soft">${words.trust.asideHint}</p>
      </div>
      <label class="check">
        <input type="checkbox" .checked=${terms.onlySure} @change=${(event: Event) => change({ onlySure: (event.target as HTMLInputElement).checked })} />
        ${words.trust.onlySure}
      </label>
    </section>`;
  }

  // Doubts

  #doubts(): TemplateResult {
    const { known } = this.view;
    if (!known) return html`<p class="soft">${words.trust.reckoning}</p>`;
    if (known.doubts.length === 0) return html`<p tabindex="-1" class="none">${words.trust.noDoubts}</p><p class="soft">${words.trust.noDoubtsHint}</p>`;
    return html`<p>${words.trust.doubtsHow}</p>
      <ol class="doubts">
        ${repeat(
          known.doubts,
          ({ item }) => item,
          (doubt, place) => this.#doubt(doubt, place),
        )}
      </ol>`;
  }

  #doubt({ item, tray, rather, why, other }: Doubt, place: number): TemplateResult {
    const name = this.#itemName(item);
    const shown = this.#examples(tray, [item]);
    const likes = other === undefined ? this.#examples(rather, [item]) : [other];
    const settle = (to: number) => this.#settle(item, to, place, to === tray);
    return html`<li data-item=${item} aria-label=${words.trust.doubtOf(name, this.#name(tray), this.#name(rather))}>
      <button class="tile doubted" aria-label=${words.trust.take(name)} title=${name} @click=${() => tell(this, 'take-out', { item })}>${this.#picture(item)}</button>
      <p class="why">${words.trust.why[why]?.(this.#name(rather))}</p>
      <div class="side given">
        <p class="soft">${words.trust.youSaid(this.#name(tray))}</p>
        <div class="strip">${shown.map((one) => this.#picture(one))}</div>
        <button class="stay" @click=${() => settle(tray)}>${words.trust.keep(this.#name(tray))} <kbd class="hint">K</kbd></button>
      </div>
      <div class="side rather">
        <p class="soft">${other === undefined ? words.trust.othersSay(this.#name(rather)) : words.trust.twinIn(this.#name(rather))}</p>
        <div class="strip">${likes.map((one) => this.#picture(one))}</div>
        <button class="move" @click=${() => settle(rather)}>${words.trust.move(this.#name(rather))} <kbd class="hint">M</kbd></button>
      </div>
    </li>`;
  }

  #settle(item: number, tray: number, place: number, stays: boolean): void {
    this.#settled = place;
    tell(this, 'settle-doubt', { item, tray, stays });
  }

  /** In the doubts: K keeps, M moves, U undoes, arrows go from one to the next. */
  readonly #onDoubtKey = (event: KeyboardEvent): void => {
    if (this.view.tab !== 'doubts' || event.ctrlKey || event.metaKey || event.altKey) return;
    const all = [...this.renderRoot.querySelectorAll<HTMLElement>('.doubts > li')];
    const here = (event.composedPath()[0] as HTMLElement).closest<HTMLElement>('.doubts > li');
    const at = here ? all.indexOf(here) : -1;
    const key = event.key.toLowerCase();
    const step = key === 'arrowdown' ? 1 : key === 'arrowup' ? -1 : 0;
    if (step !== 0 && all.length > 0) {
      all[Math.max(0, Math.min(all.length - 1, at + step))]?.querySelector<HTMLElement>('.stay')?.focus();
    } else if (this.singleKeys && !event.repeat && (key === 'k' || key === 'm')) {
      (here ?? all[0])?.querySelector<HTMLElement>(key === 'k' ? '.stay' : '.move')?.click();
    } else if (this.singleKeys && !event.repeat && key === 'u') {
      tell(this, 'undo-settled', {});
    } else {
      return;
    }
    event.preventDefault();
  };

  // Spot check

  #check(): TemplateResult {
    const { check } = this.view.snapshot;
    if (!check) return this.#planning();
    const { statement, sample, left } = check;
    if (!statement) {
      return html`<section aria-labelledby="under-way">
        <h3 id="under-way">${words.trust.underWay}</h3>
        <progress aria-label=${words.trust.lookedAt} max=${sample.length} .value=${sample.length - left}></progress>
        <p>${words.trust.lookedAtOf(sample.length - left, sample.length)}</p>
        <div class="row">
          <button class="strong" @click=${() => tell(this, 'look', {})}>${left === 0 ? words.trust.toTheEnd : words.trust.goOn}</button>
          <button @click=${() => tell(this, 'drop-check', {})}>${words.trust.giveUp}</button>
        </div>
        <p class="soft">${words.trust.giveUpHint}</p>
      </section>`;
    }
    return html`<section aria-labelledby="statement">
        <h3 id="statement">${words.trust.statementTitle}</h3>
        <blockquote class=${check.aboutNow ? '' : 'earlier'}>${statement.sentence}</blockquote>
        ${boundBar(statement)}
        <p class="soft">${words.trust.bound(statement.tolerance)}</p>
        <p><strong>${check.aboutNow ? words.trust.aboutNow : words.trust.aboutEarlier}</strong></p>
        <p>${statement.holds ? words.trust.holds(statement.tolerance) : words.trust.holdsNot(statement.tolerance)}</p>
        <div class="row">
          <button class="strong" @click=${() => tell(this, 'copy-statement', {})}>${words.trust.copy}</button>
          <button @click=${() => tell(this, 'save-note', {})}>${words.trust.saveNote}</button>
        </div>
        <p class="soft">${words.trust.statementHow}</p>
        <details>
          <summary>${words.trust.statementTrays}</summary>
          <table class="numbers">
            <caption class="visually-hidden">
              ${words.trust.statementTrays}
            </caption>
            <thead>
              <tr>
                <th scope="col">${words.trust.tray}</th>
                <th scope="col">${words.trust.sortedColumn}</th>
                <th scope="col">${words.trust.lookedAt}</th>
                <th scope="col">${words.trust.wrongColumn}</th>
                <th scope="col">${words.trust.untoldColumn}</th>
              </tr>
            </thead>
            <tbody>
              ${statement.trays.map(
                ({ tray, items, lookedAt, wrong, untold }) => html`<tr>
                  <th scope="row">${this.#name(tray)}</th>
                  <td>${items}</td>
                  <td>${lookedAt}</td>
                  <td>${wrong}</td>
                  <td>${untold}</td>
                </tr>`,
              )}
            </tbody>
          </table>
        </details>
      </section>
      <section aria-labelledby="again">
        <h3 id="again">${words.trust.again}</h3>
        ${this.#plan()}
      </section>`;
  }

  #planning(): TemplateResult {
    return html`<section aria-labelledby="planning">
      <h3 id="planning">${words.trust.planning}</h3>
      <p>${words.trust.planningHow}</p>
      ${this.#plan()}
    </section>`;
  }

  #plan(): TemplateResult {
    const { plan, size, known } = this.view;
    const change = (changed: Partial<typeof plan>) => tell(this, 'plan', { plan: { ...plan, ...changed } });
    const numberOf = (event: Event) => Number((event.target as HTMLSelectElement).value);
    return html`<div class="plan">
        <div class="field">
          <label for="tolerance">${words.trust.tolerance}</label>
          <select id="tolerance" @change=${(event: Event) => change({ tolerance: numberOf(event) })}>
            ${TOLERANCES.map((one) => html`<option value=${one} ?selected=${one === plan.tolerance}>${percent(one)}</option>`)}
          </select>
        </div>
        <div class="field">
          <label for="check-confidence">${words.trust.checkConfidence}</label>
          <select id="check-confidence" @change=${(event: Event) => change({ confidence: numberOf(event) })}>
            ${CHECK_CONFIDENCES.map((one) => html`<option value=${one} ?selected=${one === plan.confidence}>${percent(one)}</option>`)}
          </select>
        </div>
        <div class="field">
          <label for="allowed">${words.trust.allowed}</label>
          <select id="allowed" @change=${(event: Event) => change({ allowed: numberOf(event) })}>
            ${ALLOWED.map((one) => html`<option value=${one} ?selected=${one === plan.allowed}>${one === 0 ? words.trust.none : one}</option>`)}
          </select>
        </div>
      </div>
      <label class="check">
        <input type="checkbox" .checked=${plan.byTray} @change=${(event: Event) => change({ byTray: (event.target as HTMLInputElement).checked })} />
        ${words.trust.byTrayCheck}
      </label>
      ${size
        ? html`<p class="big" role="status">
              <strong>${size.size}</strong> <span>${words.trust.size(size.items)}</span>
            </p>
            <div class="row"><button class="strong" @click=${() => tell(this, 'start-check', {})}>${words.trust.start(size.size)}</button></div>`
        : html`<p>${known ? words.trust.nothingToCheck : words.trust.reckoning}</p>`}`;
  }

  /** Once the doubts are reckoned anew, the focus goes to the one that took the settled one's place. */
  override updated(changed: PropertyValues<this>): void {
    const before = changed.get('view') as TrustView | undefined;
    if (this.#settled === undefined || !before || before.known === this.view.known) return;
    const all = this.renderRoot.querySelectorAll<HTMLElement>('.doubts .stay');
    const next = all[Math.min(this.#settled, all.length - 1)] ?? this.renderRoot.querySelector<HTMLElement>('.none');
    this.#settled = undefined;
    next?.focus();
  }

  static override styles = [...Panel.styles, plotStyles, trustStyles];
}

customElements.define('ken-trust-panel', TrustPanel);
