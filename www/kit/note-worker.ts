import * as Comlink from 'comlink';
import { expose } from './bridge';
import { fetchKept, NoteEncoder, type NoteTable, readNoteTable, startCore } from './core';
import { csv } from './csv';
import type { EncoderFacts } from './encode-worker';
import { KenspeckleError } from './error';

export interface ReadNote {
  embedding: Float32Array<ArrayBuffer>;
  /** Mostly short words and parts of longer ones. */
  tokens: number;
  /** 1 unless the note is long: then it was read in so many parts and averaged. */
  parts: number;
  /** The same for two notes with the same text. */
  fingerprint: string;
}

/** A file of notes at a glance. */
export interface TableHead {
  columns: string[];
  rows: number;
  /** The first rows, one cell a column, long cells cut. */
  first: string[][];
  /** By column: rows with something in it. */
  filled: number[];
  /** By column: characters in it, all rows together. */
  characters: number[];
  encoding: NoteTable['encoding'];
  /** What could not be taken: one sentence each, which begins with the line. */
  troubles: string[];
  /** The same for two files with the same content. */
  fingerprint: string;
}

/** A note in a file. */
export interface NoteInFile {
  row: number;
  /** From 1. */
  line: number;
  text: string;
}

/** A file to be handed back with what became of its rows. */
export interface HandBack {
  name: string;
  file: Blob;
  /** By row: the cells of `found`; `null` for a row to leave out; nothing for one that was not read. */
  found: readonly (readonly string[] | null | undefined)[];
}

const FIRST_ROWS = 8;
const FIRST_CHARACTERS = 400;

let encoder: NoteEncoder | undefined;
let opened: NoteTable | undefined;

async function bytesOf(file: Blob): Promise<Uint8Array<ArrayBuffer>> {
  try {
    return new Uint8Array(await file.arrayBuffer());
  } catch {
    throw new KenspeckleError('file-unreadable', 'the file can’t be opened. Was it moved or deleted?');
  }
}

async function hex(bytes: Uint8Array<ArrayBuffer>): Promise<string> {
  const sum = new Uint8Array(await crypto.subtle.digest('SHA-256', bytes));
  return [...sum.subarray(0, 16)].map((byte) => byte.toString(16).padStart(2, '0')).join('');
}

/** A name that none of the others has. */
function free(name: string, others: ReadonlySet<string>): string {
  return others.has(name) ? free(`${name}'`, others) : name;
}

const api = {
  /** Makes everything but `read` usable, which needs `start` too. */
  async startReading(module: WebAssembly.Module): Promise<void> {
    await startCore(module);
  },

  /** Fetches the encoder, unless the device keeps it. */
  async start(module: WebAssembly.Module, url: string, report: (done: number) => void): Promise<EncoderFacts> {
    await startCore(module);
    encoder = new NoteEncoder(await fetchKept(new URL(url), report));
    return { identity: encoder.identity, dimension: encoder.dimension, nonNegative: encoder.nonNegative };
  },

  /** Throws "note-empty" and "note-too-long". */
  read(note: string): ReadNote {
    if (!encoder) throw new Error('the encoder has not been started');
    const result = encoder.read(note);
    try {
      const embedding = result.embedding() as Float32Array<ArrayBuffer>;
      const read = { embedding, tokens: result.tokens, parts: result.parts, fingerprint: result.fingerprint };
      return Comlink.transfer(read, [embedding.buffer]);
    } finally {
      result.free();
    }
  },

  /**
   * Reads a file by the ending of its name and holds it until another is opened. Throws "file-too-large", "not-text",
   * "table-empty" and "table-unreadable".
   */
  async openTable(file: Blob, name: string): Promise<TableHead> {
    const bytes = await bytesOf(file);
    const table = readNoteTable(bytes, name);
    opened = table;
    const { columns, rows, encoding, troubles } = table;
    const total = (of: (cell: string) => number) => columns.map((_, at) => rows.reduce((sum, row) => sum + of(row[at] ?? ''), 0));
    return {
      columns,
      rows: rows.length,
      first: rows.slice(0, FIRST_ROWS).map((row) => row.map((cell) => cell.slice(0, FIRST_CHARACTERS))),
      filled: total((cell) => Number(cell.trim() !== '')),
      characters: total((cell) => cell.length),
      encoding,
      troubles,
      fingerprint: await hex(bytes),
    };
  },

  /** The notes in a column of the open file, from a row on, `most` rows at once; rows without one are left out. */
  notes(column: number, from: number, most: number): NoteInFile[] {
    if (!opened) throw new Error('no file is open');
    const { rows, lines } = opened;
    const notes: NoteInFile[] = [];
    for (let row = from; row < Math.min(from + most, rows.length); row++) {
      const text = rows[row]?.[column] ?? '';
      if (text.trim() !== '') notes.push({ row, line: lines[row] ?? 0, text });
    }
    return notes;
  },

  /** The open file of lines as one text, empty lines and all. */
  whole(): string {
    if (!opened) throw new Error('no file is open');
    const { rows, lines } = opened;
    const text: string[] = [];
    rows.forEach((row, at) => (text[(lines[at] ?? 1) - 1] = row[0] ?? ''));
    return Array.from(text, (line) => line ?? '').join('\n').trim();
  },

  async rowOf(file: Blob, name: string, row: number): Promise<[column: string, cell: string][]> {
    const { columns, rows } = readNoteTable(await bytesOf(file), name);
    return columns.map((column, at) => [column, rows[row]?.[at] ?? '']);
  },

  closeTable(): void {
    opened = undefined;
  },

  /**
   * The files as one table, every column as it came, and the columns `names` after them. Columns of the same name are one;
   * with several files a column tells which one a row is from.
   */
  async handBack(files: readonly HandBack[], names: readonly string[]): Promise<Blob> {
    const read: { name: string; table: NoteTable; found: HandBack['found'] }[] = [];
    for (const { name, file, found } of files) read.push({ name, found, table: readNoteTable(await bytesOf(file), name) });
    const columns = [...new Set(read.flatMap(({ table }) => table.columns))];
    const taken = new Set(columns);
    const source = read.length > 1 ? [free('file', taken)] : [];
    const added = names.map((name) => free(name, taken));
    const parts = [csv([[...source, ...columns, ...added]])];
    for (const { name, table, found } of read) {
      const places = columns.map((column) => table.columns.indexOf(column));
      const rows: string[][] = [];
      table.rows.forEach((cells, row) => {
        const of = found[row];
        if (of === null) return;
        const own = places.map((place) => cells[place] ?? '');
        rows.push([...(read.length > 1 ? [name] : []), ...own, ...(of ?? names.map(() => ''))]);
      });
      parts.push(csv(rows));
    }
    return new Blob(parts, { type: 'text/csv' });
  },
};

export type NoteApi = typeof api;

expose(api);
