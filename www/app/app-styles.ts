import { css } from 'lit';

export const appStyles = css`
  :host {
    display: flex;
    flex-direction: column;
    min-height: 100dvh;
  }
  header {
    display: grid;
    grid-template-columns: auto minmax(0, 1fr) auto;
    align-items: center;
    gap: 0.6rem 1.6rem;
    padding: 10px 20px;
  }
  header.working {
    position: sticky;
    z-index: 3;
    top: 0;
    background: var(--bench);
    border-bottom: 1px solid var(--line);
  }
  .brand {
    display: flex;
    align-items: center;
    gap: 0.5rem;
    font-size: 1.15rem;
    font-weight: 700;
    letter-spacing: -0.01em;
  }
  .brand svg {
    width: 34px;
    height: 34px;
    fill: var(--edge);
  }
  .brand .bright {
    fill: var(--bright);
  }
  nav {
    display: flex;
    gap: 8px;
    white-space: nowrap;
  }
  .about {
    min-width: 44px;
    min-height: 44px;
    padding-inline: 0;
    font-weight: 700;
  }
  .wide {
    white-space: pre;
  }
  .narrow {
    display: none;
  }
  .ways {
    inset: 62px 20px auto auto;
    width: min(20rem, calc(100vw - 2rem));
    margin: 0;
    padding: 8px;
    border: 1px solid var(--edge);
    border-radius: 12px;
    background: var(--surface);
    color: var(--ink);
  }
  .ways button {
    display: block;
    width: 100%;
    text-align: start;
  }
  .ways p {
    padding: 6px 14px;
    font-size: 0.88rem;
  }
  ken-reading {
    margin: 10px 20px -6px;
  }
  main:not(.failure) {
    flex: 1;
    display: grid;
    grid-template-columns: minmax(380px, 32%) minmax(0, 1fr);
    align-items: start;
    gap: 24px;
    padding: 14px 20px 24px;
  }
  .hand {
    position: sticky;
    top: 106px;
    max-height: calc(100dvh - 118px);
    display: flex;
    flex-direction: column;
    overflow: auto;
    margin: -6px;
    padding: 6px;
    scrollbar-width: thin;
  }
  ken-question {
    flex: 0 1 auto;
    /* Below this nothing gives way any more, and the whole part scrolls. */
    min-height: 21rem;
  }
  .side {
    display: grid;
    gap: 6px;
    min-width: 0;
  }
  .offer {
    color: var(--ink-soft);
    font-size: 0.94rem;
  }
  .offer button {
    padding-inline: 0.4rem;
    color: var(--ink);
    text-decoration: underline;
    text-underline-offset: 3px;
  }
  .said {
    flex: none;
    min-height: 1.5em;
    margin-top: 0.6rem;
    color: var(--ink-soft);
    font-size: 0.94rem;
  }
  footer {
    padding: 14px 20px 20px;
    border-top: 1px solid var(--line);
    font-size: 0.9rem;
    color: var(--ink-soft);
  }
  footer p {
    max-width: 62rem;
  }
  footer .row {
    max-width: none;
    margin-top: 4px;
  }
  footer button {
    text-decoration: underline;
    text-underline-offset: 3px;
  }
  ken-welcome {
    flex: 1;
    display: grid;
    align-items: center;
  }
  .failure {
    flex: 1;
    display: grid;
    align-content: center;
    gap: 1rem;
    max-width: 40rem;
    margin: 0 auto;
    padding: 2rem;
  }
  .dropping {
    position: fixed;
    z-index: 10;
    inset: 12px;
    display: grid;
    place-items: center;
    border: 4px dashed var(--bright);
    border-radius: 18px;
    background: color-mix(in srgb, var(--bench) 88%, transparent);
    font-size: 1.6rem;
    font-weight: 700;
    pointer-events: none;
  }
  @media (max-width: 1000px) {
    header.working {
      grid-template-columns: auto minmax(0, 1fr);
    }
    header.working .pile {
      grid-row: 2;
      grid-column: 1 / -1;
    }
    nav {
      justify-content: flex-end;
    }
  }
  @media (max-width: 820px) {
    header {
      padding: 8px 12px;
      gap: 0.3rem 0.6rem;
    }
    header.working {
      position: static;
    }
    .brand svg {
      width: 28px;
    }
    .wide {
      display: none;
    }
    header.working .brand span {
      position: absolute;
      clip-path: inset(50%);
    }
    .narrow {
      display: inline;
    }
    nav {
      gap: 6px;
    }
    nav button:not(.about) {
      padding-inline: 0.65rem;
      font-size: 0.94rem;
    }
    main:not(.failure) {
      grid-template-columns: minmax(0, 1fr);
      padding: 10px 12px 20px;
    }
    .hand {
      position: static;
      max-height: none;
      overflow: visible;
    }
    ken-question {
      min-height: 0;
    }
    ken-reading {
      margin-inline: 12px;
    }
    footer {
      padding-inline: 12px;
    }
  }
`;
