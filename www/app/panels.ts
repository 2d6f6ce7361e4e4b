import { css, html, LitElement, nothing, type PropertyValues, type TemplateResult } from 'lit';
import type { Tray } from '../kit/client';
import { tell } from './event';
import { shared } from './styles';
import { words } from './words';

/** A panel over the page. It is in the page only while it is open, and tells `closed` when it goes. */
abstract class Panel extends LitElement {
  protected abstract content(): TemplateResult;
  protected abstract readonly label: string;

  get #dialog(): HTMLDialogElement | null {
    return this.renderRoot.querySelector('dialog');
  }

  protected override firstUpdated(_changed: PropertyValues<this>): void {
    this.#dialog?.showModal();
  }

  close(): void {
    this.#dialog?.close();
  }

  #onClick(event: MouseEvent): void {
    if (event.target === this.#dialog) this.close();
  }

  override render(): TemplateResult {
    return html`<dialog aria-label=${this.label} @close=${() => tell(this, 'closed', {})} @click=${this.#onClick}>
      <div class="inside">${this.content()}</div>
    </dialog>`;
  }

  static override styles = [
    shared,
    css`
      dialog {
        padding: 0;
      }
      .inside {
        display: grid;
        gap: 1rem;
        padding: 1.4rem;
      }
      .inside h2 {
        margin: 0;
      }
      h3 {
        font-size: 1.05rem;
        margin-bottom: 0.4rem;
      }
      ol {
        display: grid;
        gap: 0.35rem;
        padding-inline-start: 1.4rem;
      }
      dl {
        display: grid;
        grid-template-columns: max-content 1fr;
        gap: 0.4rem 1rem;
      }
      form,
      label {
        display: grid;
        gap: 0.35rem;
      }
      form > .row {
        flex-wrap: nowrap;
      }
      .check {
        display: flex;
        align-items: center;
        gap: 0.6rem;
        min-height: 44px;
      }
      .check input {
        width: 22px;
        height: 22px;
        accent-color: var(--ink);
      }
      .top {
        flex-wrap: nowrap;
        justify-content: space-between;
      }
      .end {
        justify-content: flex-end;
      }
      .error {
        color: var(--alarm);
      }
      hr {
        width: 100%;
        margin: 0;
        border: 0;
        border-top: 1px solid var(--line);
      }
    `,
  ];
}

export class HelpPanel extends Panel {
  static override properties = { singleKeys: { type: Boolean } };
  declare singleKeys: boolean;
  protected readonly label = words.helpTitle;

  protected content(): TemplateResult {
    return html`<div class="row top">
        <h2>${words.helpTitle}</h2>
        <button autofocus @click=${() => this.close()}>${words.close}</button>
      </div>
      <ol>
        ${words.helpSteps.map((step) => html`<li>${step}</li>`)}
      </ol>
      <div>
        <h3>${words.keysTitle}</h3>
        <dl>
          ${words.keys.map(
            ([key, does]) =>
              html`<dt><kbd>${key}</kbd></dt>
                <dd>${does}</dd>`,
          )}
        </dl>
        <label class="check">
          <input
            type="checkbox"
            .checked=${this.singleKeys}
            @change=${(event: Event) => tell(this, 'single-keys', { on: (event.target as HTMLInputElement).checked })}
          />
          ${words.singleKeys}
        </label>
      </div>
      <div>
        <h3>${words.privacyTitle}</h3>
        <p>${words.privacy}</p>
      </div>
      <div>
        <h3>${words.limitsTitle}</h3>
        <p>${words.limits}</p>
        <p>${words.caution}</p>
      </div>`;
  }
}

export class TrayPanel extends Panel {
  static override properties = { tray: { attribute: false }, others: { attribute: false }, error: { type: String } };
  declare tray: Tray;
  declare others: readonly Tray[];
  declare error: string | undefined;
  protected readonly label = words.trayMenu('');

  #rename(event: SubmitEvent): void {
    event.preventDefault();
    const name = this.renderRoot.querySelector('input')?.value.trim() ?? '';
    tell(this, 'rename-tray', { tray: this.tray.tray, name });
  }

  #merge(event: SubmitEvent): void {
    event.preventDefault();
    const into = Number(this.renderRoot.querySelector('select')?.value);
    tell(this, 'merge-trays', { from: this.tray.tray, into });
  }

  protected content(): TemplateResult {
    return html`<h2>${words.tray(this.tray.name)}</h2>
      <form @submit=${this.#rename}>
        <label for="name">${words.name}</label>
        <div class="row">
          <input id="name" autofocus autocomplete="off" maxlength="120" .value=${this.tray.name} aria-describedby="error" />
          <button class="strong">${words.rename}</button>
        </div>
        <p id="error" class="error" role="alert">${this.error ?? ''}</p>
      </form>
      ${this.others.length > 0
        ? html`<form @submit=${this.#merge}>
            <label for="into">${words.mergeInto}</label>
            <div class="row">
              <select id="into">
                ${this.others.map(({ tray, name }) => html`<option value=${tray}>${name}</option>`)}
              </select>
              <button>${words.merge}</button>
            </div>
          </form>`
        : nothing}
      <hr />
      <div class="row">
        <button class="alarm" @click=${() => tell(this, 'remove-tray', { tray: this.tray.tray })}>${words.remove}</button>
        <span class="soft">${words.removeHint}</span>
      </div>
      <div class="row end"><button @click=${() => this.close()}>${words.close}</button></div>`;
  }
}

export class StartOverPanel extends Panel {
  static override properties = { loss: { type: String }, canTeach: { type: Boolean } };
  declare loss: string;
  declare canTeach: boolean;
  protected readonly label = words.startOverTitle;

  protected content(): TemplateResult {
    return html`<h2>${words.startOverTitle}</h2>
      <p>${this.loss}</p>
      ${this.canTeach
        ? html`<p>${words.startOverTeach}</p>
            <div class="row"><button @click=${() => tell(this, 'learn', {})}>${words.learn}</button></div>`
        : nothing}
      <div class="row end">
        <button autofocus @click=${() => this.close()}>${words.cancel}</button>
        <button class="alarm" @click=${() => tell(this, 'clear', {})}>${words.startOverDo}</button>
      </div>`;
  }
}

export class ZoomPanel extends Panel {
  static override properties = { picture: { attribute: false }, name: { attribute: false }, full: { state: true } };
  declare picture: string | undefined;
  declare name: string;
  declare full: boolean;
  protected readonly label = words.zoom;

  protected content(): TemplateResult {
    return html`<div class="row top">
        <h2>${this.name}</h2>
        <button autofocus @click=${() => this.close()}>${words.close} <kbd class="hint">Z</kbd></button>
      </div>
      <img src=${this.picture ?? nothing} alt=${this.name} class=${this.full ? 'full' : ''} @click=${() => (this.full = !this.full)} />`;
  }

  static override styles = [
    ...Panel.styles,
    css`
      dialog {
        width: calc(100vw - 2rem);
        max-width: none;
        height: calc(100dvh - 2rem);
      }
      .inside {
        height: 100%;
        grid-template-rows: auto minmax(0, 1fr);
        padding: 0.8rem;
      }
      h2 {
        min-width: 0;
        overflow-wrap: anywhere;
        font-size: 1.05rem;
      }
      img {
        width: 100%;
        height: 100%;
        object-fit: contain;
        cursor: zoom-in;
      }
      img.full {
        width: auto;
        height: auto;
        min-width: 100%;
        cursor: zoom-out;
      }
    `,
  ];
}

customElements.define('ken-help', HelpPanel);
customElements.define('ken-tray-panel', TrayPanel);
customElements.define('ken-start-over', StartOverPanel);
customElements.define('ken-zoom', ZoomPanel);

export { Panel };
