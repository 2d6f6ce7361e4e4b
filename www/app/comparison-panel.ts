import { css, html, nothing, svg, type SVGTemplateResult, type TemplateResult } from 'lit';
import type { Hindsight, HindsightPoint } from '../kit/client';
import type { ComparisonView } from './comparison';
import { tell } from './event';
import { Panel } from './panels';
import { count, percent, words } from './words';

/** The drawing, in its own units. */
const WIDTH = 560;
const HEIGHT = 250;
const LEFT = 62;
const RIGHT = 22;
const TOP = 12;
const BOTTOM = 48;

/** The person's answers beside random order: a sentence, a small plot, and the same as a table. */
export class ComparisonPanel extends Panel {
  static override properties = { view: { attribute: false } };

  declare view: ComparisonView;
  protected readonly label = words.compareTitle;

  protected content(): TemplateResult {
    const { working, found, stale, said } = this.view;
    return html`<div class="row top">
        <h2>${words.compareTitle}</h2>
        <button autofocus @click=${() => this.close()}>${words.close}</button>
      </div>
      ${working !== undefined
        ? html`<div class="row">
            <progress aria-label=${words.compareWorkingShort} max="1" .value=${working}></progress>
            <span class="figures">${words.compareWorking(working)}</span>
            <button @click=${() => tell(this, 'stop-compare', {})}>${words.stop}</button>
          </div>`
        : nothing}
      ${found ? this.#found(found) : nothing}
      <p role="status" ?hidden=${said === ''}>${said}</p>
      ${working === undefined && (!found || stale)
        ? html`<div class="row">
            <button class="strong" @click=${() => tell(this, 'work-compare', {})}>${words.compareAgain}</button>
            ${stale ? html`<span class="soft">${words.compareSince}</span>` : nothing}
          </div>`
        : nothing}
      ${words.compareHow.map((line) => html`<p class="soft small">${line}</p>`)}`;
  }

  #found(found: Hindsight): TemplateResult {
    const { given, random, least, most, tried } = found;
    const sentence = random === undefined ? words.compareMore(given, tried) : words.compareResult(given, random);
    return html`<p class="sentence" role="status">
        <strong>${sentence}</strong> ${words.compareRange(least, most, tried)}
        ${random !== undefined && random <= given ? words.compareNoGain : nothing}
      </p>
      ${this.#plot(found, sentence)} ${this.#table(found)}`;
  }

  #plot({ own, inRandomOrder, given, random, reached }: Hindsight, sentence: string): TemplateResult {
    const last = Math.max(given, random ?? 0, ...inRandomOrder.map(({ answers }) => answers));
    const x = (answers: number) => LEFT + ((WIDTH - LEFT - RIGHT) * answers) / last;
    const y = (right: number) => TOP + (HEIGHT - TOP - BOTTOM) * (1 - right);
    const line = (points: readonly HindsightPoint[]) => points.map(({ answers, right }) => `${x(answers).toFixed(1)},${y(right).toFixed(1)}`).join(' ');
    const mark = (answers: number, kind: string): SVGTemplateResult => svg`<line class="drop ${kind}" x1=${x(answers)} x2=${x(answers)} y1=${y(reached.expected)} y2=${y(0)} />
      <circle class=${kind} cx=${x(answers)} cy=${y(reached.expected)} r="5" />`;
    const ends = random === undefined ? [given, last] : [given, random];
    return html`<figure>
      <svg viewBox="0 0 ${WIDTH} ${HEIGHT}" role="img" aria-label=${sentence}>
        ${[0, 0.25, 0.5, 0.75, 1].map(
          (right) => svg`<line class="grid" x1=${LEFT} x2=${WIDTH - RIGHT} y1=${y(right)} y2=${y(right)} />
            <text class="tick" x=${LEFT - 8} y=${y(right) + 4} text-anchor="end">${percent(right)}</text>`,
        )}
        <polyline class="random" points=${line(inRandomOrder)} />
        <polyline class="own" points=${line(own)} />
        ${mark(given, 'own')} ${random === undefined ? nothing : mark(random, 'random')}
        ${ends.map((answers) => svg`<text class="tick" x=${x(answers)} y=${y(0) + 22} text-anchor="middle">${count(Math.round(answers))}</text>`)}
        <text class="tick" x=${LEFT} y=${y(0) + 22} text-anchor="middle">0</text>
        <text class="axis" x=${WIDTH - RIGHT} y=${HEIGHT - 2} text-anchor="end">${words.compareAnswers}</text>
      </svg>
      <figcaption class="row">
        <span class="key"><svg viewBox="0 0 34 10" aria-hidden="true"><polyline class="own" points="2,5 32,5" /></svg>${words.compareOwn}</span>
        <span class="key"><svg viewBox="0 0 34 10" aria-hidden="true"><polyline class="random" points="2,5 32,5" /></svg>${words.compareRandom}</span>
      </figcaption>
    </figure>`;
  }

  #table({ own, inRandomOrder }: Hindsight): TemplateResult {
    const numbers = [...new Set([...own, ...inRandomOrder].map(({ answers }) => answers))].sort((a, b) => a - b);
    const right = (points: readonly HindsightPoint[], answers: number) => {
      const point = points.find((one) => one.answers === answers);
      return point ? percent(point.right) : '';
    };
    return html`<details>
      <summary>${words.compareFigures}</summary>
      <table>
        <thead>
          <tr>
            <th scope="col">${words.compareAnswers}</th>
            <th scope="col">${words.compareRight}, ${words.compareOwn}</th>
            <th scope="col">${words.compareRight}, ${words.compareRandom}</th>
          </tr>
        </thead>
        <tbody>
          ${numbers.map(
            (answers) =>
              html`<tr>
                <th scope="row">${count(answers)}</th>
                <td>${right(own, answers)}</td>
                <td>${right(inRandomOrder, answers)}</td>
              </tr>`,
          )}
        </tbody>
      </table>
    </details>`;
  }

  static override styles = [
    ...Panel.styles,
    css`
      progress {
        flex: 1 1 8rem;
        max-width: 24rem;
      }
      .figures,
      table {
        font-variant-numeric: tabular-nums;
      }
      .sentence {
        font-size: 1.1rem;
      }
      .small {
        font-size: 0.92rem;
      }
      figure {
        margin: 0;
      }
      figure > svg {
        display: block;
        width: 100%;
        height: auto;
      }
      svg {
        direction: ltr;
        forced-color-adjust: none;
      }
      polyline {
        fill: none;
        stroke-width: 2.5;
        stroke-linejoin: round;
      }
      polyline.own {
        stroke: var(--ink);
      }
      polyline.random {
        stroke: var(--edge);
        stroke-dasharray: 7 5;
      }
      circle.own {
        fill: var(--ink);
      }
      circle.random {
        fill: var(--edge);
      }
      .drop {
        stroke: var(--edge);
        stroke-width: 1;
      }
      .grid {
        stroke: var(--line);
        stroke-width: 1;
      }
      text {
        font-size: 13px;
        fill: var(--ink-soft);
      }
      @media (max-width: 600px) {
        text {
          font-size: 21px;
        }
        polyline {
          stroke-width: 4;
        }
      }
      .key {
        display: inline-flex;
        align-items: center;
        gap: 0.5rem;
        font-size: 0.94rem;
      }
      .key svg {
        width: 34px;
        height: 10px;
      }
      summary {
        min-height: 44px;
        display: flex;
        align-items: center;
        cursor: pointer;
        text-decoration: underline;
        text-underline-offset: 3px;
      }
      table {
        border-collapse: collapse;
      }
      th,
      td {
        padding: 0.2rem 1rem 0.2rem 0;
        text-align: start;
        font-weight: 400;
        border-bottom: 1px solid var(--line);
      }
      thead th {
        font-weight: 600;
      }
    `,
  ];
}

customElements.define('ken-comparison', ComparisonPanel);
