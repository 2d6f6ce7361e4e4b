import { css, html, nothing, type PropertyValues, type TemplateResult } from 'lit';
import { tell } from './event';
import type { NotesStep } from './notes-in';
import { Panel } from './panels';
import { words } from './words';

const notePanelStyles = css`
  .inside {
    width: min(40rem, calc(100vw - 2rem));
  }
  h2 {
    overflow-wrap: anywhere;
  }
  ul.preview {
    display: grid;
    gap: 4px;
    padding: 0;
    list-style: none;
  }
  .preview li {
    display: -webkit-box;
    -webkit-box-orient: vertical;
    -webkit-line-clamp: 2;
    overflow: hidden;
    padding: 4px 10px;
    border-radius: 8px;
    background: var(--raised);
    overflow-wrap: anywhere;
  }
  .end {
    justify-content: flex-end;
  }
  .note {
    padding: 8px 12px;
    border: 1.5px solid var(--edge);
    border-radius: var(--radius);
  }
  fieldset {
    margin: 0;
    padding: 0;
    border: 0;
  }
  legend {
    padding: 0;
    font-weight: 600;
  }
  textarea {
    font: inherit;
    color: inherit;
    width: 100%;
    min-height: 12rem;
    padding: 0.6rem 0.75rem;
    border: 1px solid var(--edge);
    border-radius: var(--radius);
    background: var(--raised);
    resize: vertical;
  }
`;

/** What a file of notes leaves open: which column holds the notes, or whether a file of text is one note or many. */
export class NotesPanel extends Panel {
  static override properties = { step: { attribute: false } };
  declare step: NotesStep;
  protected readonly label = words.addNotesTitle;

  protected content(): TemplateResult {
    const { step } = this;
    return html`<h2>${step.name}</h2>
      ${step.ask === 'column' ? this.#column(step) : this.#lines(step)}`;
  }

  #column({ head, column }: Extract<NotesStep, { ask: 'column' }>): TemplateResult {
    const filled = head.filled[column] ?? 0;
    const first = head.first.map((row) => row[column] ?? '').filter((cell) => cell.trim() !== '');
    return html`<label for="column"><b>${words.columnQuestion}</b></label>
      <select
        id="column"
        autofocus
        @change=${(event: Event) => tell(this, 'notes-choose', { column: Number((event.target as HTMLSelectElement).value) })}
      >
        ${head.columns.map((name, at) => html`<option value=${at} ?selected=${at === column}>${name || words.namelessColumn(at + 1)}</option>`)}
      </select>
      <p class="soft">${words.columnHint}</p>
      ${this.#preview(first, head.encoding === 'Windows-1252')}
      <p class=${filled === 0 ? 'error' : ''} role="status">${filled === 0 ? words.emptyColumn : words.columnFacts(filled, head.rows)}</p>
      ${head.troubles.length > 0
        ? html`<details class="note">
            <summary>${words.troubles(head.troubles.length)}</summary>
            <ul>
              ${head.troubles.map((trouble) => html`<li>${trouble}</li>`)}
            </ul>
          </details>`
        : nothing}
      ${this.#end(filled)}`;
  }

  #lines({ files, lines, first, guessed, each }: Extract<NotesStep, { ask: 'lines' }>): TemplateResult {
    const option = (value: boolean, text: string) => html`<label class="check">
      <input
        type="radio"
        name="each"
        ?autofocus=${value === each}
        .checked=${value === each}
        @change=${() => tell(this, 'notes-choose', { each: value })}
      />
      ${text}
    </label>`;
    return html`<fieldset>
        <legend>${words.linesQuestion}</legend>
        ${option(false, words.everyLine(lines))} ${option(true, words.everyFile(files))}
      </fieldset>
      ${this.#preview(each ? [first.join(' ')] : first, guessed)} ${this.#end(each ? files : lines)}`;
  }

  #preview(first: readonly string[], guessed: boolean): TemplateResult {
    return html`${guessed ? html`<p class="note" role="note">${words.guessed}</p>` : nothing}
      <div>
        <h3>${words.preview}</h3>
        <ul class="preview">
          ${first.slice(0, 5).map((note) => html`<li dir="auto">${note}</li>`)}
        </ul>
      </div>`;
  }

  #end(notes: number): TemplateResult {
    return html`<div class="row end">
      <button @click=${() => this.close()}>${words.leaveOut}</button>
      <button class="strong" ?disabled=${notes === 0} @click=${() => tell(this, 'notes-settle', {})}>${words.addThem(notes)}</button>
    </div>`;
  }

  static override styles = [...Panel.styles, notePanelStyles];
}

/** Notes to paste or to write, one a line. */
export class WritePanel extends Panel {
  static override properties = { text: { attribute: false }, count: { state: true } };
  /** What was pasted onto the page. */
  declare text: string;
  declare count: number;
  protected readonly label = words.writeTitle;

  constructor() {
    super();
    this.text = '';
    this.count = 0;
  }

  protected override willUpdate(changed: PropertyValues<this>): void {
    if (changed.has('text')) this.#count(this.text);
  }

  get #written(): string {
    return this.renderRoot.querySelector('textarea')?.value ?? '';
  }

  #count(text: string): void {
    this.count = text.split('\n').filter((line) => line.trim() !== '').length;
  }

  protected content(): TemplateResult {
    return html`<h2>${words.writeTitle}</h2>
      <label for="written">${words.writeLabel}</label>
      <textarea
        id="written"
        dir="auto"
        ?autofocus=${this.text === ''}
        .value=${this.text}
        @input=${() => this.#count(this.#written)}
        @keydown=${(event: KeyboardEvent) => {
          if (event.key === 'Enter' && (event.ctrlKey || event.metaKey)) this.#add();
        }}
      ></textarea>
      <p class="soft" role="status">${words.writeFound(this.count)}</p>
      <div class="row end">
        <button @click=${() => this.close()}>${words.leaveOut}</button>
        <button class="strong" ?autofocus=${this.text !== ''} ?disabled=${this.count === 0} @click=${this.#add}>
          ${words.addThem(this.count)}
        </button>
      </div>`;
  }

  #add(): void {
    if (this.count === 0) return;
    tell(this, 'written', { text: this.#written });
    this.close();
  }

  static override styles = [...Panel.styles, notePanelStyles];
}

/** One note, whole, with its row. */
export class NotePanel extends Panel {
  static override properties = { text: { attribute: false }, name: { attribute: false }, row: { attribute: false } };
  declare text: string;
  declare name: string;
  /** Absent until the file is open. */
  declare row: readonly (readonly [column: string, cell: string])[] | undefined;
  protected readonly label = words.zoom;

  protected content(): TemplateResult {
    const others = this.row?.filter(([, cell]) => cell !== this.text);
    return html`<div class="row top">
        <h2>${this.name}</h2>
        <button autofocus @click=${() => this.close()}>${words.close} <kbd class="hint">Z</kbd></button>
      </div>
      <p class="text" dir="auto">${this.text}</p>
      ${others === undefined
        ? html`<p class="soft">${words.rowOpening}</p>`
        : others.length > 0
          ? html`<hr />
              <dl>
                ${others.map(
                  ([column, cell]) =>
                    html`<dt>${column}</dt>
                      <dd dir="auto">${cell}</dd>`,
                )}
              </dl>`
          : nothing}`;
  }

  static override styles = [
    ...Panel.styles,
    notePanelStyles,
    css`
      .text {
        font-size: 1.3rem;
        white-space: pre-wrap;
        overflow-wrap: anywhere;
      }
      h2 {
        min-width: 0;
        font-size: 1.05rem;
      }
      dt {
        font-weight: 600;
        overflow-wrap: anywhere;
      }
      dd {
        white-space: pre-wrap;
        overflow-wrap: anywhere;
      }
    `,
  ];
}

customElements.define('ken-notes-panel', NotesPanel);
customElements.define('ken-write', WritePanel);
customElements.define('ken-note', NotePanel);
