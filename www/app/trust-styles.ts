import { css } from 'lit';

export const trustStyles = css`
  dialog {
    max-width: min(58rem, calc(100vw - 2rem));
    width: 100%;
    /* Tabs stay where they are, however much is below them. */
    margin-top: 1rem;
  }
  .inside {
    gap: 0.8rem;
  }
  .top button {
    flex: none;
  }
  .tabs {
    display: flex;
    flex-wrap: wrap;
    gap: 6px;
    border-bottom: 3px solid var(--edge);
  }
  .tabs button {
    border-radius: var(--radius) var(--radius) 0 0;
    border-bottom: 0;
    min-height: 44px;
  }
  .tabs button[aria-selected='true'] {
    background: var(--ink);
    border-color: var(--ink);
    color: var(--bench);
    font-weight: 600;
  }
  @media (forced-colors: active) {
    .tabs button[aria-selected='true'] {
      forced-color-adjust: none;
      background: Highlight;
      border-color: Highlight;
      color: HighlightText;
    }
  }
  .number {
    display: inline-block;
    min-width: 1.6em;
    border-radius: 1em;
    border: 1px solid currentColor;
    font-size: 0.82em;
    font-variant-numeric: tabular-nums;
    text-align: center;
  }
  .news:not(:has(p:not(:empty))) {
    display: none;
  }
  .news p {
    font-weight: 600;
  }
  .sheet {
    display: grid;
    gap: 1.4rem;
    min-width: 0;
  }
  section {
    display: grid;
    gap: 0.6rem;
    min-width: 0;
  }
  .sheet > * + * {
    padding-top: 1.2rem;
    border-top: 1px solid var(--line);
  }
  .sheet > p + *,
  .sheet > .doubts {
    padding-top: 0;
    border-top: 0;
  }
  .plots {
    display: grid;
    grid-template-columns: repeat(auto-fit, minmax(min(22rem, 100%), 1fr));
    gap: 1.4rem 2rem;
  }
  .plots section {
    align-content: start;
  }
  h3 {
    margin: 0;
    font-size: 1.15rem;
  }
  p {
    max-width: 46rem;
  }
  .big {
    display: flex;
    flex-wrap: wrap;
    align-items: baseline;
    gap: 0 0.7rem;
  }
  .big strong {
    font-size: 2rem;
    line-height: 1.1;
    font-variant-numeric: tabular-nums;
  }
  table {
    border-collapse: collapse;
    width: 100%;
  }
  th[scope='row'] {
    padding-inline-end: 1rem;
    text-align: start;
    font-weight: 600;
    width: 9rem;
    overflow-wrap: anywhere;
  }
  tbody:not(.numbers tbody) td {
    display: grid;
    grid-template-columns: minmax(6rem, 1fr) 15rem;
    align-items: center;
    gap: 0 1rem;
    padding-block: 4px;
  }
  .figures,
  .numbers td {
    font-variant-numeric: tabular-nums;
  }
  .numbers {
    width: auto;
  }
  .numbers th,
  .numbers td {
    padding: 2px 1.2rem 2px 0;
    text-align: start;
    width: auto;
  }
  .numbers th[scope='row'] {
    min-width: 5rem;
    max-width: 12rem;
    overflow-wrap: break-word;
  }
  summary {
    display: inline-flex;
    align-items: center;
    min-height: 44px;
    cursor: pointer;
    text-decoration: underline;
    text-underline-offset: 3px;
  }
  select {
    width: auto;
    min-width: 6rem;
  }
  .field {
    display: grid;
    gap: 0.2rem;
    justify-items: start;
  }
  .plan {
    display: flex;
    flex-wrap: wrap;
    gap: 0.8rem 1.6rem;
  }
  .row > label {
    display: inline;
  }
  .strip {
    display: flex;
    flex-wrap: wrap;
    align-items: center;
    gap: 5px;
  }
  .tile {
    display: block;
    flex: none;
    padding: 0;
    border: 2px solid transparent;
    border-radius: 9px;
    background: none;
    line-height: 0;
  }
  .tile:hover {
    border-color: var(--ink);
  }
  img,
  .text {
    width: 60px;
    height: 60px;
    border-radius: 7px;
    background: var(--quiet);
  }
  img {
    display: block;
    object-fit: cover;
  }
  .text {
    display: -webkit-box;
    -webkit-box-orient: vertical;
    -webkit-line-clamp: 4;
    width: 12rem;
    max-width: 100%;
    height: auto;
    padding: 4px 6px;
    overflow: hidden;
    font-size: 0.8rem;
    line-height: 1.3;
    text-align: start;
    overflow-wrap: anywhere;
  }
  .pairs,
  .doubts {
    display: grid;
    gap: 0.9rem;
    list-style: none;
    padding: 0;
  }
  .pairs {
    grid-template-columns: repeat(auto-fill, minmax(min(24rem, 100%), 1fr));
  }
  .pairs p {
    margin-bottom: 0.3rem;
  }
  .pair {
    display: flex;
    flex-wrap: wrap;
    align-items: center;
    gap: 0.4rem 0.9rem;
  }
  .like {
    padding: 4px 6px;
    border-radius: 9px;
    background: var(--quiet);
  }
  .like .soft {
    color: var(--ink);
    font-size: 0.9rem;
    margin-inline-end: 4px;
  }
  .arrow {
    width: 30px;
    height: 20px;
    flex: none;
    fill: none;
    stroke: var(--ink);
    stroke-width: 2.5px;
  }
  :host(:dir(rtl)) .arrow {
    scale: -1 1;
  }
  .doubts li {
    display: grid;
    grid-template-columns: auto minmax(0, 1fr) minmax(0, 1fr);
    gap: 0.4rem 1rem;
    padding: 10px;
    border: 1px solid var(--line);
    border-radius: 12px;
    background: var(--raised);
  }
  .doubts li:focus-within {
    border-color: var(--ink);
  }
  .doubted {
    grid-row: span 2;
    align-self: start;
  }
  .doubted img {
    width: 132px;
    height: 132px;
  }
  .doubted .text {
    width: 15rem;
    font-size: 0.94rem;
    -webkit-line-clamp: 9;
  }
  .why {
    grid-column: 2 / -1;
    font-weight: 600;
  }
  .side {
    display: grid;
    gap: 0.4rem;
    align-content: start;
    justify-items: start;
  }
  .side button {
    min-height: 44px;
    text-align: start;
  }
  .none:focus {
    outline: none;
  }
  blockquote {
    margin: 0;
    padding: 0.8rem 1rem;
    border-inline-start: 6px solid var(--bright);
    background: var(--raised);
    font-size: 1.15rem;
    user-select: all;
  }
  blockquote.earlier {
    border-inline-start-color: var(--edge);
    border-inline-start-style: dashed;
  }
  @media (max-width: 620px) {
    dialog {
      max-width: calc(100vw - 1rem);
      max-height: calc(100dvh - 1rem);
      margin-top: 0.5rem;
    }
    .inside {
      padding: 0.8rem;
    }
    .tabs {
      gap: 4px;
    }
    .tabs button {
      flex: 1 1 auto;
      padding-inline: 0.5rem;
      font-size: 0.94rem;
    }
    .pair {
      flex-direction: column;
      align-items: start;
    }
    .arrow {
      rotate: 90deg;
    }
    tbody:not(.numbers tbody) td {
      grid-template-columns: minmax(0, 1fr);
    }
    th[scope='row'] {
      width: 7rem;
      padding-inline-end: 0.6rem;
      font-size: 0.94rem;
      hyphens: auto;
    }
    .doubts li {
      grid-template-columns: minmax(0, 1fr) minmax(0, 1fr);
    }
    .doubted {
      grid-row: auto;
    }
    .doubted img {
      width: 100%;
      height: auto;
      aspect-ratio: 1;
    }
    .doubted .text {
      width: 100%;
    }
    .why {
      grid-column: 2;
    }
    .numbers th,
    .numbers td {
      padding-inline-end: 0.7rem;
    }
  }
`;
