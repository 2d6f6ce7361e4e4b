import * as Comlink from 'comlink';
import { compileCore, fetchBytes, type Assets, type NoteTable } from './core';
import type { EncoderFacts } from './encode-worker';
import { codeOf, KenspeckleError } from './error';
import type { NoteApi, ReadNote } from './note-worker';

interface Member {
  worker: Worker;
  api: Comlink.Remote<NoteApi>;
  failed: Promise<never>;
  facts: Promise<EncoderFacts> | undefined;
}

/**
 * Reads notes and files of notes in a worker of its own. The text encoder is fetched with the first note, not before; one
 * worker is enough, since a note takes a fraction of what a photo takes and the encoder's memory is not small.
 */
export class NoteReader {
  readonly #assets: Assets;
  #module: Promise<WebAssembly.Module> | undefined;
  #encoder: Promise<Uint8Array<ArrayBuffer>> | undefined;
  #member: Promise<Member> | undefined;

  /** `module` where the page has compiled it already. */
  constructor(assets: Assets, module?: Promise<WebAssembly.Module>) {
    this.#assets = assets;
    this.#module = module;
  }

  /** Fetches and starts the encoder ahead of the first note. Throws "asset-missing" and "encoder-file". */
  async warm(): Promise<EncoderFacts> {
    const member = await this.#started();
    return this.#facts(member);
  }

  /** Reads one note; a worker that dies on it is replaced and the note tried once more. */
  async read(note: string, name: string): Promise<ReadNote> {
    for (let attempt = 0; ; attempt++) {
      const member = await this.#started();
      try {
        await this.#facts(member);
        return await Promise.race([member.api.read(note), member.failed]);
      } catch (error) {
        if (codeOf(error)) throw error;
        member.worker.terminate();
        this.#member = undefined;
        if (attempt === 1) throw new KenspeckleError('encoder-failed', `${name}: reading it failed twice. Leave it out.`);
      }
    }
  }

  /** Reads a file of notes by the ending of its name; needs no encoder. */
  async readTable(file: Blob, name: string): Promise<NoteTable> {
    const { api, failed } = await this.#started();
    return Promise.race([api.readTable(file, name), failed]);
  }

  /** Ends the worker; a later note starts another. */
  close(): void {
    void this.#member?.then(({ worker }) => worker.terminate());
    this.#member = undefined;
  }

  #facts(member: Member): Promise<EncoderFacts> {
    member.facts ??= this.#startEncoder(member);
    member.facts.catch(() => (member.facts = undefined));
    return member.facts;
  }

  async #startEncoder(member: Member): Promise<EncoderFacts> {
    this.#encoder ??= fetchBytes(this.#assets.textEncoder);
    this.#encoder.catch(() => (this.#encoder = undefined));
    const [module, encoder] = await Promise.all([this.#module, this.#encoder]);
    if (!module) throw new Error('the module is compiled before a worker starts');
    const facts = await Promise.race([member.api.start(module, encoder), member.failed]);
    // The worker has it; for another start it comes from the browser's cache.
    this.#encoder = undefined;
    return facts;
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
    const failed = new Promise<never>((_, reject) => {
      worker.addEventListener('error', (event) => reject(new Error(event.message)));
    });
    failed.catch(() => undefined);
    await Promise.race([api.startReading(module), failed]);
    return { worker, api, failed, facts: undefined };
  }
}
