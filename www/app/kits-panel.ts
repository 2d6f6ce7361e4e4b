import { css, html, LitElement, nothing, type TemplateResult } from 'lit';
import { type Kind, type Kit, kindOf } from '../kit/client';
import { tell } from './event';
import { Panel } from './panels';
import { shared } from './styles';
import { words } from './words';

const listStyles = css`
  ul {
    display: grid;
    gap: 6px;
    padding: 0;
    list-style: none;
  }
  li {
    display: grid;
    gap: 6px;
    padding: 8px 8px 8px 14px;
    border-radius: var(--radius);
    background: var(--raised);
    border: 1.5px solid var(--line);
  }
  li.now {
    border-color: var(--ink);
  }
  li > .row {
    gap: 0.3rem 0.6rem;
  }
  .about {
    flex: 1 1 12rem;
    min-width: 0;
    overflow-wrap: anywhere;
  }
  .about b {
    display: block;
  }
`;

const facts = ({ encoder, items, trays, answers }: Kit): string => words.kitFacts(kindOf(encoder), items, trays, answers);

/** The kits on the empty page, each to be opened. */
export class KitList extends LitElement {
  static override properties = { kits: { attribute: false } };
  declare kits: readonly Kit[];

  override render(): TemplateResult | typeof nothing {
    if (this.kits.length === 0) return nothing;
    return html`<section aria-labelledby="kits">
      <h2 id="kits">${words.kitsTitle}</h2>
      <ul>
        ${this.kits.map(
          (kit) => html`<li>
            <div class="row">
              <span class="about"><b>${kit.name}</b> <span class="soft">${facts(kit)}</span></span>
              <button aria-label=${words.openKitLong(kit.name)} @click=${() => tell(this, 'open-kit', { id: kit.id })}>${words.openKit}</button>
            </div>
          </li>`,
        )}
      </ul>
    </section>`;
  }

  static override styles = [
    shared,
    listStyles,
    css`
      :host {
        display: block;
        width: min(34rem, 100%);
      }
      section {
        display: grid;
        gap: 0.5rem;
      }
      h2 {
        font-size: 1.1rem;
      }
      ul {
        max-height: 40vh;
        overflow: auto;
      }
    `,
  ];
}

/** All kits: to open, to name, to delete. */
export class KitsPanel extends Panel {
  static override properties = {
    kits: { attribute: false },
    current: { attribute: false },
    busy: { attribute: false },
    kept: { attribute: false },
    naming: { state: true },
    deleting: { state: true },
    problem: { state: true },
  };

  declare kits: readonly Kit[];
  declare current: string;
  /** What stands in the way of opening another: nothing, reading, or a rest that was not read. */
  declare busy: 'reading' | 'rest' | undefined;
  /** Whether this browser keeps kits. */
  declare kept: boolean;
  declare naming: string | undefined;
  declare deleting: string | undefined;
  declare problem: string;
  protected readonly label = words.kitsTitle;

  constructor() {
    super();
    this.problem = '';
  }

  protected content(): TemplateResult {
    return html`<div class="row top">
        <h2>${words.kitsTitle}</h2>
        <button autofocus @click=${() => this.close()}>${words.close}</button>
      </div>
      <p>${this.kept ? words.kitsWhat : words.kitsNotKept}</p>
      ${this.busy ? html`<p class="busy" role="note">${this.busy === 'reading' ? words.kitBusy : words.kitRest}</p>` : nothing}
      <p class="error" role="alert">${this.problem}</p>
      <ul>
        ${this.kits.map((kit) => this.#kit(kit))}
      </ul>
      ${this.kits.length === 0 && this.kept ? html`<p class="soft">${words.noKits}</p>` : nothing}
      ${this.kept
        ? html`<div class="row">
            <button class="strong" ?disabled=${this.busy === 'reading'} @click=${() => tell(this, 'new-kit', {})}>${words.newKit}</button>
            <span class="soft">${words.newKitHint}</span>
          </div>`
        : nothing}`;
  }

  #kit(kit: Kit): TemplateResult {
    const { id, name } = kit;
    const now = id === this.current;
    const sure = this.deleting === id;
    return html`<li class=${now ? 'now' : ''}>
      <div class="row">
        <span class="about"><b>${name}</b> <span class="soft">${facts(kit)}${now ? `, ${words.kitNow}` : ''}</span></span>
        ${now
          ? nothing
          : html`<button aria-label=${words.openKitLong(name)} ?disabled=${this.busy === 'reading'} @click=${() => tell(this, 'open-kit', { id })}>
              ${words.openKit}
            </button>`}
        <button aria-label=${words.renameKit(name)} @click=${() => this.#startNaming(id)}>${words.rename}</button>
        <button
          class=${sure ? 'alarm' : ''}
          aria-label=${sure ? nothing : words.deleteKit(name)}
          ?disabled=${now && this.busy === 'reading'}
          @click=${() => {
            if (sure) tell(this, 'delete-kit', { id });
            this.deleting = sure ? undefined : id;
          }}
          @blur=${() => (this.deleting = undefined)}
        >
          ${sure ? words.deleteKitSure : words.delete}
        </button>
      </div>
      ${this.naming === id
        ? html`<form class="row" @submit=${(event: SubmitEvent) => this.#rename(event, id)}>
            <input aria-label=${words.kitName} autocomplete="off" maxlength="120" .value=${name} />
            <button class="strong">${words.saveName}</button>
          </form>`
        : nothing}
    </li>`;
  }

  #startNaming(id: string): void {
    this.problem = '';
    this.naming = this.naming === id ? undefined : id;
    void this.updateComplete.then(() => this.renderRoot.querySelector('input')?.select());
  }

  #rename(event: SubmitEvent, id: string): void {
    event.preventDefault();
    const name = this.renderRoot.querySelector('input')?.value.trim() ?? '';
    const taken = this.kits.some((kit) => kit.name === name && kit.id !== id);
    this.problem = name === '' ? words.nameEmpty : taken ? words.nameTaken(name) : '';
    if (this.problem) return;
    this.naming = undefined;
    tell(this, 'rename-kit', { id, name });
  }

  static override styles = [
    ...Panel.styles,
    listStyles,
    css`
      .inside {
        width: min(40rem, calc(100vw - 2rem));
      }
      .error:empty {
        display: none;
      }
      .busy {
        padding: 8px 12px;
        border: 1.5px solid var(--edge);
        border-radius: var(--radius);
      }
      form input {
        flex: 1;
        min-width: 8rem;
      }
    `,
  ];
}

/** Photos for a kit of notes, or notes for a kit of photos: where to? */
export class OtherKindPanel extends Panel {
  static override properties = { kind: { attribute: false }, files: { attribute: false }, kit: { attribute: false }, kits: { attribute: false }, kept: { attribute: false } };
  declare kind: Kind;
  declare files: number;
  /** The name of the kit on the bench. */
  declare kit: string;
  /** Kits that could take them. */
  declare kits: readonly Kit[];
  declare kept: boolean;
  protected readonly label = words.otherTitle('photos');

  protected content(): TemplateResult {
    return html`<h2>${words.otherTitle(this.kind)}</h2>
      <p>${words.otherWhat(this.kind, this.files, this.kit)}</p>
      ${this.kept ? nothing : html`<p>${words.kitsNotKept}</p>`}
      <div class="ways">
        ${this.kept
          ? html`<button class="strong" autofocus @click=${() => tell(this, 'into-kit', {})}>${words.otherNew}</button>
              ${this.kits.map((kit) => html`<button @click=${() => tell(this, 'into-kit', { id: kit.id })}>${words.otherInto(kit.name)}</button>`)}`
          : nothing}
        <button @click=${() => this.close()}>${words.otherLeave}</button>
      </div>`;
  }

  static override styles = [
    ...Panel.styles,
    css`
      .ways {
        display: grid;
        gap: 8px;
        justify-items: stretch;
      }
      .ways button {
        overflow-wrap: anywhere;
      }
    `,
  ];
}

customElements.define('ken-kit-list', KitList);
customElements.define('ken-kits', KitsPanel);
customElements.define('ken-other-kind', OtherKindPanel);
