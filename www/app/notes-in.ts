import { messageOf, type NoteFile, type NoteInFile, type Readers, type Source, type TableHead } from '../kit/client';
import { words } from './words';

/** A question about files of notes that the person has to answer before they are added. */
export type NotesStep =
  | { ask: 'column'; name: string; head: TableHead; column: number }
  | { ask: 'lines'; name: string; files: number; lines: number; first: readonly string[]; guessed: boolean; each: boolean };

/** Takes what is to be added. */
export interface Taker {
  addNotes(file: NoteFile, notes: readonly NoteInFile[], name: (note: NoteInFile) => string): Promise<void>;
  complain(problem: string): void;
}

/** The column of a file of lines, as the core calls it. */
const LINES = 'note';

const isLines = (name: string): boolean => /\.(txt|text)$/i.test(name);

/** Whether a file holds notes, by the ending of its name. */
export function isNotes({ name }: Source): boolean {
  return isLines(name) || /\.(csv|tsv|tab|jsonl|ndjson)$/i.test(name);
}

interface Opened {
  name: string;
  file: Blob;
  head: TableHead;
}

/** Files of notes on their way into the pile: one file after the other, and a question where it can't be told what a note is. */
export class NotesIn {
  readonly #readers: Readers;
  readonly #redraw: () => void;
  /** What has to be asked now. */
  step: NotesStep | undefined;
  #answer: ((go: boolean) => void) | undefined;
  #turn: Promise<unknown> = Promise.resolve();
  #pasted = 0;

  constructor(readers: Readers, redraw: () => void) {
    this.#readers = readers;
    this.#redraw = redraw;
  }

  /** Changes what is chosen in the step. */
  choose(change: { column?: number; each?: boolean }): void {
    if (this.step) this.step = { ...this.step, ...change } as NotesStep;
    this.#redraw();
  }

  /** Ends the step: with its choice, or leaving its files out. */
  settle(go: boolean): void {
    this.#answer?.(go);
  }

  /** Takes files in; resolves when they are read. */
  async take(files: readonly Source[], to: Taker): Promise<void> {
    const work = this.#turn.then(() => this.#take(files, to));
    this.#turn = work.catch(() => undefined);
    await work;
  }

  /** Takes lines that were pasted or written: one note a line. */
  async takeLines(text: string, to: Taker): Promise<void> {
    const name = words.pasted(++this.#pasted);
    const work = this.#turn.then(async () => {
      const opened = await this.#open({ name, blob: new Blob([text], { type: 'text/plain' }) }, to);
      if (opened) await this.#add(opened, 0, to);
    });
    this.#turn = work.catch(() => undefined);
    await work;
  }

  /** Takes a table whose column of notes is known. */
  async takeColumn(source: Source, column: string, to: Taker): Promise<void> {
    const opened = await this.#open(source, to);
    if (opened) await this.#add(opened, Math.max(0, opened.head.columns.indexOf(column)), to);
  }

  async #take(files: readonly Source[], to: Taker): Promise<void> {
    const lines = files.filter(({ name }) => isLines(name));
    if (lines.length > 0) await this.#takeText(lines, to);
    const chosen = new Map<string, number>();
    for (const source of files.filter(({ name }) => !isLines(name))) {
      const opened = await this.#open(source, to);
      if (!opened) continue;
      const { columns, encoding } = opened.head;
      const alike = JSON.stringify(columns);
      const sure = columns.length === 1 && encoding !== 'Windows-1252' ? 0 : undefined;
      const column = chosen.get(alike) ?? sure ?? (await this.#askColumn(opened));
      if (column === undefined) continue;
      chosen.set(alike, column);
      await this.#add(opened, column, to);
    }
  }

  async #open({ name, blob }: Source, to: Taker): Promise<Opened | undefined> {
    try {
      const file = typeof blob === 'function' ? await blob() : blob;
      return { name, file, head: await this.#readers.notes.openTable(file, name) };
    } catch (error) {
      to.complain(words.fileProblem(name, messageOf(error)));
      return undefined;
    }
  }

  async #ask(step: NotesStep): Promise<boolean> {
    this.step = step;
    this.#redraw();
    const go = await new Promise<boolean>((answer) => (this.#answer = answer));
    this.#answer = undefined;
    return go;
  }

  #asked(): void {
    this.step = undefined;
    this.#redraw();
  }

  async #askColumn({ name, head }: Opened): Promise<number | undefined> {
    // Notes are what has the longest cells as a rule.
    const longest = head.characters.indexOf(Math.max(...head.characters));
    const go = await this.#ask({ ask: 'column', name, head, column: longest });
    const column = this.step?.ask === 'column' ? this.step.column : longest;
    this.#asked();
    return go ? column : undefined;
  }

  /** One file alone is a list with a note a line; of several, each is a note. Either way it is asked. */
  async #takeText(files: readonly Source[], to: Taker): Promise<void> {
    const opened: Opened[] = [];
    for (const source of files) {
      const one = await this.#open(source, to);
      if (one) opened.push(one);
    }
    const [first] = opened;
    if (!first) return;
    const go = await this.#ask({
      ask: 'lines',
      name: opened.length === 1 ? first.name : words.someFiles(opened.length),
      files: opened.length,
      lines: opened.reduce((sum, { head }) => sum + head.rows, 0),
      first: first.head.first.map(([line = '']) => line),
      guessed: opened.some(({ head }) => head.encoding === 'Windows-1252'),
      each: opened.length > 1,
    });
    const each = this.step?.ask === 'lines' && this.step.each;
    this.#asked();
    if (!go) return;
    if (each) return this.#addEach(opened, to);
    for (const { name, file } of opened) {
      const again = await this.#open({ name, blob: file }, to);
      if (again) await this.#add(again, 0, to);
    }
  }

  /** Files that are a note each become one file with their names and texts, so that both are handed back. */
  async #addEach(opened: readonly Opened[], to: Taker): Promise<void> {
    const lines: string[] = [];
    const names: string[] = [];
    for (const { name, file } of opened) {
      if (!(await this.#open({ name, blob: file }, to))) continue;
      names.push(name);
      lines.push(JSON.stringify({ file: name, [LINES]: await this.#readers.notes.whole() }));
    }
    const together = { name: words.manyFiles(names.length), blob: new Blob([lines.join('\n')]) };
    const all = await this.#open(together, to);
    if (all) await this.#add(all, all.head.columns.indexOf(LINES), to, ({ row }) => names[row] ?? '');
  }

  async #add({ name, file, head }: Opened, column: number, to: Taker, called?: (note: NoteInFile) => string): Promise<void> {
    const notes = await this.#readers.notes.notes(head, column);
    await this.#readers.notes.closeTable();
    if (head.troubles.length > 0) to.complain(words.leftOut(name, head.troubles));
    if (notes.length === 0) return to.complain(words.fileProblem(name, words.emptyColumn));
    const kept = { name, file, column: head.columns[column] ?? LINES, fingerprint: head.fingerprint };
    await to.addNotes(kept, notes, called ?? (({ line }) => words.noteAt(name, line)));
  }
}
