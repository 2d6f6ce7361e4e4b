import { css, html, nothing, svg, type TemplateResult } from 'lit';
import type { Assessment, Projection, Share, Statement } from '../kit/client';
import { percent, words } from './words';

/*
 * Pictures of numbers that the core gives: nothing is reckoned here but places in the picture. Each is hidden from screen readers; who
 * shows one says the same in words or in a table beside it.
 */

type Calibration = NonNullable<Assessment['calibration']>;
type Curve = NonNullable<Assessment['curve']>;

/** A share as a bar, its 95 % interval as a line with ends. */
export function shareBar({ value, wilson }: Share): TemplateResult {
  return html`<svg class="share" viewBox="0 0 100 20" preserveAspectRatio="none" aria-hidden="true">
    <rect class="track" width="100" height="20" />
    ${value !== null
      ? svg`<rect class="bar" y="4" width=${100 * value} height="12" />
          <path class="whisker" d="M ${100 * wilson.low} 10 H ${100 * wilson.high} M ${100 * wilson.low} 4 v 12 M ${100 * wilson.high} 4 v 12" />`
      : nothing}
  </svg>`;
}

/** What a spot check leaves possible, beside what is tolerated: half as much again as the larger of the two is the whole width. */
export function boundBar({ share, tolerance }: Statement): TemplateResult {
  const whole = 1.5 * Math.max(share, tolerance);
  return html`<svg class="share" viewBox="0 0 100 20" preserveAspectRatio="none" aria-hidden="true">
    <rect class="track" width="100" height="20" />
    <rect class="bar" y="4" width=${(100 * share) / whole} height="12" />
    <path class="aim" d="M ${(100 * tolerance) / whole} 0 V 20" />
  </svg>`;
}

/** Pixels of a plot: a frame with room for the figures at its axes. */
const WIDTH = 420;
const LEFT = 52;
const RIGHT = 14;
const TOP = 14;
const BOTTOM = 46;

interface Frame {
  height: number;
  x: (share: number) => number;
  y: (share: number) => number;
}

function frame(height: number): Frame {
  return {
    height,
    x: (share) => LEFT + share * (WIDTH - LEFT - RIGHT),
    y: (share) => height - BOTTOM - share * (height - TOP - BOTTOM),
  };
}

/** Figures along both axes; the grid they belong to. */
function axes({ height, x, y }: Frame, acrossTicks: [number, string][], upTicks: [number, string][], across: string): TemplateResult {
  return svg`${upTicks.map(([at, text]) => svg`<path class="grid" d="M ${x(0)} ${y(at)} H ${x(1)}" /><text x=${LEFT - 8} y=${y(at) + 5} text-anchor="end">${text}</text>`)}
    <path class="axis" d="M ${x(0)} ${y(1)} V ${y(0)} H ${x(1)}" />
    ${acrossTicks.map(([at, text], place) => svg`<path class="axis" d="M ${x(at)} ${y(0)} v 5" /><text x=${x(at)} y=${y(0) + 20} text-anchor=${place === acrossTicks.length - 1 ? 'end' : 'middle'}>${text}</text>`)}
    <text class="name" x=${(x(0) + x(1)) / 2} y=${height - 6} text-anchor="middle">${across}</text>`;
}

/** What was said against what came out: on the dashed line the probabilities keep their word. */
export function calibrationPlot({ bins }: Calibration): TemplateResult {
  const plot = frame(320);
  const { x, y } = plot;
  const ticks = [0, 0.25, 0.5, 0.75, 1].map((share): [number, string] => [share, percent(share)]);
  return html`<svg class="plot" viewBox="0 0 ${WIDTH} ${plot.height}" aria-hidden="true">
    ${axes(plot, ticks, ticks, words.trust.said)}
    <path class="aim" d="M ${x(0)} ${y(0)} L ${x(1)} ${y(1)}" />
    ${bins.map(
      ({ said, right, wilson }) => svg`<path class="whisker" d="M ${x(said)} ${y(wilson.low)} V ${y(wilson.high)} M ${x(said) - 5} ${y(wilson.low)} h 10 M ${x(said) - 5} ${y(wilson.high)} h 10" />
        <circle class="dot" cx=${x(said)} cy=${y(right)} r="6" />`,
    )}
  </svg>`;
}

/** What more answers would bring: the likely accuracy as a line, what is possible as a band, the target dashed. */
export function curvePlot({ ahead }: Curve, target: number, projection: Projection | undefined): TemplateResult {
  const plot = frame(280);
  const last = ahead[ahead.length - 1]?.more || 1;
  const floor = Math.floor(10 * Math.min(target, ...ahead.map(({ low }) => low))) / 10;
  const x = (more: number) => plot.x(more / last);
  const y = (accuracy: number) => plot.y((accuracy - floor) / (1 - floor));
  const upTicks = Array.from({ length: Math.round(10 * (1 - floor)) + 1 }, (_, step) => floor + step / 10)
    .filter((_, step, all) => all.length <= 6 || step % 2 === (all.length - 1) % 2)
    .map((accuracy): [number, string] => [(accuracy - floor) / (1 - floor), percent(accuracy)]);
  const quarters = [0, 0.25, 0.5, 0.75, 1].map((share): [number, string] => [share, share === 0 ? words.trust.now : `+${Math.round(share * last)}`]);
  const line = (points: readonly { more: number; at: number }[]) => points.map(({ more, at }) => `${x(more)} ${y(at)}`).join(' L ');
  const high = ahead.map(({ more, high: at }) => ({ more, at }));
  const low = ahead.map(({ more, low: at }) => ({ more, at })).reverse();
  const reached = projection?.likely;
  return html`<svg class="plot" viewBox="0 0 ${WIDTH} ${plot.height}" aria-hidden="true">
    ${axes(plot, quarters, upTicks, words.trust.moreAnswers)}
    <path class="band" d="M ${line([...high, ...low])} Z" />
    <path class="line" d="M ${line(ahead.map(({ more, likely: at }) => ({ more, at })))}" />
    <path class="aim" d="M ${plot.x(0)} ${y(target)} H ${plot.x(1)}" />
    ${reached !== undefined && reached !== null && reached <= last ? svg`<circle class="dot" cx=${x(reached)} cy=${y(target)} r="6" />` : nothing}
  </svg>`;
}

export const plotStyles = css`
  svg.share {
    display: block;
    width: 100%;
    height: 20px;
  }
  svg.plot {
    display: block;
    width: min(100%, 30rem);
    height: auto;
  }
  .track {
    fill: var(--quiet);
  }
  .bar {
    fill: var(--edge);
  }
  .whisker {
    fill: none;
    stroke: var(--ink);
    stroke-width: 2px;
    vector-effect: non-scaling-stroke;
  }
  .plot text {
    fill: var(--ink);
    font-size: 15px;
    font-variant-numeric: tabular-nums;
  }
  .grid,
  .axis,
  .aim,
  .line {
    fill: none;
    stroke: var(--line);
  }
  .axis {
    stroke: var(--edge);
  }
  .aim {
    vector-effect: non-scaling-stroke;
    stroke: var(--ink-soft);
    stroke-width: 2px;
    stroke-dasharray: 7 6;
  }
  .line {
    stroke: var(--ink);
    stroke-width: 3px;
  }
  .band {
    fill: var(--edge);
    opacity: 0.32;
  }
  .dot {
    fill: var(--bright);
    stroke: var(--ink);
    stroke-width: 2px;
  }
  @media (forced-colors: active) {
    svg {
      forced-color-adjust: none;
    }
    .track {
      fill: Canvas;
      stroke: CanvasText;
      vector-effect: non-scaling-stroke;
    }
    /* Pale enough for the line across it, whatever the colours are. */
    .bar,
    .band {
      fill: CanvasText;
      opacity: 0.35;
    }
    .whisker,
    .line,
    .axis,
    .aim {
      stroke: CanvasText;
    }
    .grid {
      stroke: GrayText;
    }
    .plot text {
      fill: CanvasText;
    }
    .dot {
      fill: Highlight;
      stroke: CanvasText;
    }
  }
`;
