import * as Comlink from 'comlink';
import { expose } from './bridge';
import { NoteEncoder, readNoteTable, startCore, type NoteTable } from './core';
import type { EncoderFacts } from './encode-worker';

export interface ReadNote {
  embedding: Float32Array<ArrayBuffer>;
  /** Mostly short words and parts of longer ones. */
  tokens: number;
  /** 1 unless the note is long: then it was read in so many parts and averaged. */
  parts: number;
  /** The same for two notes with the same text. */
  fingerprint: string;
}

let encoder: NoteEncoder | undefined;

const api = {
  /** Makes `readTable` usable; `read` needs `start` too. */
  async startReading(module: WebAssembly.Module): Promise<void> {
    await startCore(module);
  },

  async start(module: WebAssembly.Module, file: Uint8Array): Promise<EncoderFacts> {
    await startCore(module);
    encoder = new NoteEncoder(file);
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

  /** Throws "file-too-large", "not-text", "table-empty" and "table-unreadable". */
  async readTable(file: Blob, name: string): Promise<NoteTable> {
    return readNoteTable(new Uint8Array(await file.arrayBuffer()), name);
  },
};

export type NoteApi = typeof api;

expose(api);
