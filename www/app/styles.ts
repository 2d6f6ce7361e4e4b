import { css } from 'lit';

/** What buttons, fields, keys and dialogs look like everywhere. */
export const shared = css`
  *,
  *::before,
  *::after {
    box-sizing: border-box;
  }
  h1,
  h2,
  h3,
  p,
  ul,
  ol,
  dl,
  dd {
    margin: 0;
    padding: 0;
  }
  [hidden] {
    display: none !important;
  }
  button,
  input,
  select {
    font: inherit;
    color: inherit;
  }
  button {
    min-height: var(--touch);
    padding: 0.25rem 0.85rem;
    border: 1px solid var(--edge);
    border-radius: var(--radius);
    background: var(--raised);
    cursor: pointer;
    touch-action: manipulation;
  }
  button:hover {
    border-color: var(--ink);
  }
  button:disabled,
  button.strong:disabled,
  button.bright:disabled {
    cursor: default;
    color: var(--ink-soft);
    background: transparent;
    border-color: var(--line);
  }
  button.strong {
    background: var(--ink);
    border-color: var(--ink);
    color: var(--bench);
    font-weight: 600;
  }
  button.bright {
    background: var(--bright);
    border-color: var(--bright);
    color: var(--on-bright);
    font-weight: 600;
  }
  button.alarm {
    color: var(--alarm);
    border-color: currentColor;
  }
  button.plain {
    border-color: transparent;
    background: transparent;
  }
  button.plain:hover {
    border-color: var(--edge);
  }
  input:not([type='checkbox']),
  select {
    min-height: var(--touch);
    padding: 0.25rem 0.75rem;
    border: 1px solid var(--edge);
    border-radius: var(--radius);
    background: var(--raised);
    width: 100%;
  }
  input::placeholder {
    color: var(--ink-soft);
    opacity: 1;
  }
  :focus-visible {
    outline: 3px solid var(--focus);
    outline-offset: 2px;
  }
  kbd {
    display: inline-block;
    min-width: 1.6em;
    padding: 0 0.35em;
    border: 1px solid var(--edge);
    border-bottom-width: 2px;
    border-radius: 5px;
    background: var(--surface);
    color: var(--ink);
    font: inherit;
    font-size: 0.82em;
    font-variant-numeric: tabular-nums;
    line-height: 1.45;
    text-align: center;
  }
  @media (pointer: coarse) {
    kbd.hint {
      display: none;
    }
  }
  dialog {
    max-width: min(42rem, calc(100vw - 2rem));
    max-height: calc(100dvh - 2rem);
    padding: 1.5rem;
    border: 1px solid var(--edge);
    border-radius: 14px;
    background: var(--surface);
    color: var(--ink);
    overflow: auto;
    overscroll-behavior: contain;
  }
  dialog::backdrop {
    background: rgb(10 16 13 / 0.55);
  }
  dialog h2 {
    font-size: 1.35rem;
    line-height: 1.25;
    margin-bottom: 0.75rem;
  }
  progress {
    height: 12px;
    appearance: none;
    border: 0;
    border-radius: 6px;
    background: var(--quiet);
    overflow: hidden;
    accent-color: var(--ink);
  }
  progress::-webkit-progress-bar {
    background: var(--quiet);
  }
  progress::-webkit-progress-value {
    background: var(--ink);
  }
  progress::-moz-progress-bar {
    background: var(--ink);
  }
  .row {
    display: flex;
    flex-wrap: wrap;
    gap: 0.6rem;
    align-items: center;
  }
  .soft {
    color: var(--ink-soft);
  }
  .visually-hidden {
    position: absolute;
    width: 1px;
    height: 1px;
    overflow: hidden;
    clip-path: inset(50%);
    white-space: nowrap;
  }
`;
