import { css } from 'lit';

export const questionStyles = css`
  :host {
    display: flex;
    flex-direction: column;
  }
  section {
    flex: 1 1 auto;
    display: flex;
    flex-direction: column;
    gap: 0.7rem;
    min-height: 0;
  }
  section > * {
    flex: none;
  }
  header {
    display: flex;
    align-items: baseline;
    gap: 0.8rem;
  }
  h2 {
    font-size: 1.55rem;
    line-height: 1.2;
    white-space: nowrap;
  }
  h2:focus {
    outline: none;
  }
  .name {
    min-width: 0;
    margin-inline-start: auto;
    overflow: hidden;
    text-overflow: ellipsis;
    white-space: nowrap;
    font-size: 0.88rem;
    direction: rtl;
    unicode-bidi: plaintext;
  }
  .mat {
    position: relative;
    display: flex;
    flex: 1 1 clamp(190px, 40vh, 460px);
    min-height: clamp(100px, 20vh, 170px);
    padding: 8px;
    border-radius: 14px;
    background: var(--bright);
  }
  img {
    min-height: 0;
    width: 100%;
    height: 100%;
    object-fit: contain;
    border-radius: 8px;
    background: var(--quiet);
    cursor: grab;
  }
  .mat.note {
    flex-direction: column;
    gap: 8px;
    flex-basis: clamp(120px, 26vh, 460px);
  }
  .mat .text {
    flex: 1 1 auto;
    min-height: 3.2em;
    overflow: auto;
    padding: 12px 14px;
    border-radius: 8px;
    background: var(--raised);
    font-size: 1.16rem;
    line-height: 1.5;
    white-space: pre-wrap;
    overflow-wrap: anywhere;
    scrollbar-width: thin;
  }
  .under {
    flex: none;
    flex-wrap: nowrap;
    justify-content: space-between;
    color: var(--on-bright);
    font-size: 0.9rem;
  }
  .under button {
    flex: none;
    color: var(--ink);
    background: var(--surface);
  }
  .zoom {
    position: absolute;
    inset-block-end: 14px;
    inset-inline-end: 14px;
    background: var(--surface);
  }
  ken-strip {
    flex: 0 1 auto;
    min-height: 150px;
  }
  .rows {
    display: grid;
    grid-template-columns: repeat(auto-fill, minmax(min(165px, 100%), 1fr));
    gap: 8px;
    list-style: none;
    /* The trays are what gives way when there is not room for all. The margin is for the ring of the focus. */
    flex: 0 1 auto;
    min-height: 60px;
    margin: -6px;
    padding: 6px;
    overflow: hidden auto;
    scrollbar-width: thin;
  }
  .choice {
    position: relative;
    display: flex;
    align-items: center;
    gap: 0.45rem;
    width: 100%;
    min-height: 46px;
    padding: 4px 8px 8px;
    text-align: start;
    overflow: hidden;
  }
  button.choice::after {
    content: '';
    position: absolute;
    inset-inline-start: 0;
    inset-block-end: 0;
    block-size: 5px;
    inline-size: calc(var(--fraction) * 100%);
    background: var(--edge);
  }
  .choice .label {
    flex: 1;
    min-width: 0;
    overflow-wrap: anywhere;
    hyphens: auto;
    display: -webkit-box;
    -webkit-box-orient: vertical;
    -webkit-line-clamp: 2;
    overflow: hidden;
    line-height: 1.2;
    font-size: 0.97rem;
    font-weight: 600;
  }
  .choice .figure {
    font-variant-numeric: tabular-nums;
    color: var(--ink-soft);
    font-size: 0.85rem;
  }
  .choice.guessed {
    flex-wrap: wrap;
    row-gap: 0;
    border: 2px solid var(--bright);
    background: var(--bright-soft);
  }
  .choice.guessed .label {
    -webkit-line-clamp: 3;
  }
  .choice.guessed .figure {
    color: inherit;
    font-weight: 600;
  }
  .choice.guessed::after {
    background: var(--bright);
  }
  .choice .guess {
    flex-basis: 100%;
    font-size: 0.8rem;
    line-height: 1.3;
  }
  .choice.plausible {
    flex-wrap: wrap;
    row-gap: 0;
    border: 2px dashed var(--edge);
  }
  .choice.given {
    box-shadow: inset 0 0 0 2px var(--ink);
  }
  .no-key {
    width: 1.6em;
    font-size: 0.82em;
  }
  @media (pointer: coarse), (max-width: 820px) {
    .mat {
      flex-basis: clamp(190px, 33vh, 460px);
    }
  }
  @media (max-width: 820px) {
    .mat {
      flex-basis: clamp(180px, 27vh, 460px);
    }
    .rows {
      max-height: max(180px, 29vh);
    }
  }
  @media (min-width: 821px) and (max-height: 680px) {
    section {
      gap: 0.45rem;
    }
  }
  @media (pointer: coarse) {
    .choice kbd,
    .no-key {
      display: none;
    }
  }
  .field {
    position: relative;
  }
  .in-field {
    position: absolute;
    inset-inline-end: 10px;
    top: 50%;
    translate: 0 -50%;
    pointer-events: none;
  }
  input:focus + .in-field {
    visibility: hidden;
  }
  #found {
    flex: 0 1 auto;
    min-height: 100px;
    max-height: 15rem;
    overflow: auto;
    display: grid;
    gap: 4px;
  }
  .option {
    padding-block: 4px;
    border: 2px solid transparent;
    border-radius: var(--radius);
    background: var(--raised);
    cursor: pointer;
  }
  .option[aria-selected='true'] {
    border-color: var(--ink);
  }
  /* The strip keeps its rows as long as the trays can scroll. */
  ken-strip ~ .rows {
    flex-shrink: 50;
    min-height: 116px;
  }
  .hint-line {
    font-size: 0.94rem;
  }
  .standing {
    display: flex;
    flex-wrap: wrap;
    align-items: center;
    font-size: 0.94rem;
  }
`;
