import * as Comlink from 'comlink';
import { type Assets, compileCore } from './core';
import type { EncoderFacts } from './encode-worker';
import { codeOf, KenspeckleError } from './error';
import type { HandBack, NoteApi, NoteInFile, ReadNote, TableHead } from './note-worker';

export type { HandBack, NoteInFile, ReadNote, TableHead } from './note-worker';

interface Member {
  worker: Worker;
  api: Comlink.Remote<NoteApi>;
  failed: Promise<never>;
  /** Makes all that waits for this worker fail. */
  fail: (reason: KenspeckleError) => void;
  facts: Promise<EncoderFacts> | undefined;
}

/** How much of the encoder has arrived, in bytes. */
export interface Fetched {
  done: number;
  total: number;
}

/** Rows of a file that come over from the worker at once. */
const ROWS_AT_ONCE = 2000;

/**
 * Reads notes and files of notes in a worker of its own. The text encoder is fetched with the first note, not before; one
 * worker is enough, since a note takes a fraction of what a photo takes and the encoder's memory is not small.
 */
export class NoteReader {
  /** Hears how the encoder arrives, and of nothing (`undefined`) once it is there or failed to come. */
  onFetch: (fetched: Fetched | undefined) => void = () => undefined;
  readonly #assets: Assets;
  #module: Promise<WebAssembly.Module> | undefined;
  #member: Promise<Member> | undefined;
  #facts: EncoderFacts | undefined;
  #fetching: Member | undefined;

  /** `module` where the page has compiled it already. */
  constructor(assets: Assets, module?: Promise<WebAssembly.Module>) {
    this.#assets = assets;
    this.#module = module;
  }

  /** Known after the first note, or after `warm`. */
  get facts(): EncoderFacts {
    if (!this.#facts) throw new Error('the encoder has not started yet');
    return this.#facts;
  }

  /** Fetches and starts the encoder ahead of the first note. Throws "asset-missing" and "encoder-file". */
  async warm(): Promise<EncoderFacts> {
    return this.#encoder(await this.#started());
  }

  /** Breaks off fetching the encoder, if that is under way: what waits for it fails with "fetch-stopped". A later note begins anew. */
  stopFetching(): void {
    const fetching = this.#fetching;
    if (!fetching) return;
    this.#end(fetching);
    fetching.fail(new KenspeckleError('fetch-stopped', 'Fetching the reader for notes was stopped.'));
  }

  /** Reads one note; a worker that dies on it is replaced and the note tried once more. */
  async read(note: string, name: string): Promise<ReadNote> {
    for (let attempt = 0; ; attempt++) {
      const member = await this.#started();
      try {
        await this.#encoder(member);
        return await Promise.race([member.api.read(note), member.failed]);
      } catch (error) {
        if (codeOf(error)) throw error;
        this.#end(member);
        if (attempt === 1) throw new KenspeckleError('encoder-failed', `${name}: reading it failed twice. Leave it out.`);
      }
    }
  }

  /** Reads a file of notes by the ending of its name; needs no encoder. Other calls about a file are about this one. */
  async openTable(file: Blob, name: string): Promise<TableHead> {
    return this.#inWorker(({ openTable }) => openTable(file, name));
  }

  /** All notes in a column of the open file. */
  async notes({ rows }: TableHead, column: number): Promise<NoteInFile[]> {
    const all: NoteInFile[] = [];
    for (let from = 0; from < rows; from += ROWS_AT_ONCE) {
      all.push(...(await this.#inWorker(({ notes }) => notes(column, from, ROWS_AT_ONCE))));
    }
    return all;
  }

  /** The open file of lines as a single note. */
  async whole(): Promise<string> {
    return this.#inWorker(({ whole }) => whole());
  }

  /** A row of a file: its columns with their cells. */
  async rowOf(file: Blob, name: string, row: number): Promise<[column: string, cell: string][]> {
    return this.#inWorker(({ rowOf }) => rowOf(file, name, row));
  }

  /** Forgets the open file. */
  async closeTable(): Promise<void> {
    await this.#inWorker(({ closeTable }) => closeTable());
  }

  /** Files as one table with what became of their rows. */
  async handBack(files: readonly HandBack[], names: readonly string[]): Promise<Blob> {
    return this.#inWorker(({ handBack }) => handBack(files, names));
  }

  /** Ends the worker; a later note starts another. */
  close(): void {
    void this.#member?.then(({ worker }) => worker.terminate()).catch(() => undefined);
    this.#member = undefined;
  }

  async #inWorker<T>(call: (api: Comlink.Remote<NoteApi>) => Promise<T>): Promise<T> {
    const member = await this.#started();
    try {
      return await Promise.race([call(member.api), member.failed]);
    } catch (error) {
      // Without a code it is the worker that failed, for want of memory as a rule.
      if (!codeOf(error)) this.#end(member);
      throw error;
    }
  }

  #end({ worker }: Member): void {
    worker.terminate();
    this.#member = undefined;
  }

  #encoder(member: Member): Promise<EncoderFacts> {
    member.facts ??= this.#startEncoder(member);
    member.facts.catch(() => (member.facts = undefined));
    return member.facts;
  }

  async #startEncoder(member: Member): Promise<EncoderFacts> {
    const module = await this.#module;
    if (!module) throw new Error('the module is compiled before a worker starts');
    const { textEncoder, textEncoderBytes: total } = this.#assets;
    const report = Comlink.proxy((done: number) => {
      if (!this.#facts) this.onFetch({ done, total });
    });
    this.#fetching = member;
    try {
      this.#facts = await Promise.race([member.api.start(module, textEncoder.href, report), member.failed]);
      return this.#facts;
    } finally {
      this.#fetching = undefined;
      this.onFetch(undefined);
    }
  }

  #started(): Promise<Member> {
    this.#member ??= this.#start();
    this.#member.catch(() => (this.#member = undefined));
    return this.#member;
  }

  async #start(): Promise<Member> {
    this.#module ??= compileCore(this.#assets.wasm);
    this.#module.catch(() => (this.#module = undefined));
    const module = await this.#module;
    const worker = new Worker(new URL('./note-worker.ts', import.meta.url), { type: 'module' });
    const api = Comlink.wrap<NoteApi>(worker);
    let fail: Member['fail'] = () => undefined;
    const failed = new Promise<never>((_, reject) => {
      fail = reject;
      worker.addEventListener('error', (event) => reject(new Error(event.message)));
    });
    failed.catch(() => undefined);
    await Promise.race([api.startReading(module), failed]);
    return { worker, api, failed, fail, facts: undefined };
  }
}
