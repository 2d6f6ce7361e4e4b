import * as Comlink from 'comlink';
import type { EncodeApi, EncoderFacts, ReadPhoto } from './encode-worker';
import { codeOf, KenspeckleError } from './error';

interface Member {
  worker: Worker;
  api: Comlink.Remote<EncodeApi>;
  failed: Promise<never>;
}

/** More workers than this only fight for memory. */
const MOST_WORKERS = 4;

/** Encode workers, each with its own module and network. One core stays free for the page. */
export class EncodePool {
  readonly size = Math.max(1, Math.min(MOST_WORKERS, navigator.hardwareConcurrency - 1));
  readonly #start: () => Promise<{ module: WebAssembly.Module; encoder: Uint8Array }>;
  readonly #idle: Member[] = [];
  readonly #waiting: (() => void)[] = [];
  #busy = 0;
  #facts: EncoderFacts | undefined;

  constructor(start: () => Promise<{ module: WebAssembly.Module; encoder: Uint8Array }>) {
    this.#start = start;
  }

  /** Known after the first photo, or after `warm`. */
  get facts(): EncoderFacts {
    if (!this.#facts) throw new Error('no encoder has started yet');
    return this.#facts;
  }

  /** Starts one worker ahead of the first photo. */
  async warm(): Promise<void> {
    if (this.#facts === undefined) this.#idle.push(await this.#member());
  }

  /**
   * Reads one photo. A worker that dies on it is replaced and the photo tried once more, since the reason may have been
   * the memory that earlier photos left behind.
   */
  async read(photo: Blob, name: string, thumbnailSide: number): Promise<ReadPhoto> {
    if (this.#busy === this.size) await new Promise<void>((resolve) => this.#waiting.push(resolve));
    else this.#busy++;
    try {
      return await this.#readNow(photo, name, thumbnailSide);
    } finally {
      const next = this.#waiting.shift();
      if (next) next();
      else this.#busy--;
    }
  }

  async #readNow(photo: Blob, name: string, thumbnailSide: number): Promise<ReadPhoto> {
    for (let attempt = 0; ; attempt++) {
      const member = this.#idle.pop() ?? (await this.#member());
      try {
        const read = await Promise.race([member.api.read(photo, thumbnailSide), member.failed]);
        this.#idle.push(member);
        return read;
      } catch (error) {
        if (codeOf(error)) {
          this.#idle.push(member);
          throw error;
        }
        if (error instanceof DOMException) {
          this.#idle.push(member);
          throw new KenspeckleError('file-unreadable', 'The file can’t be opened. Was it moved or deleted?');
        }
        member.worker.terminate();
        if (attempt === 1) throw new KenspeckleError('encoder-failed', `${name}: reading it failed twice. Leave it out.`);
      }
    }
  }

  async #member(): Promise<Member> {
    const { module, encoder } = await this.#start();
    const worker = new Worker(new URL('./encode-worker.ts', import.meta.url), { type: 'module' });
    const api = Comlink.wrap<EncodeApi>(worker);
    const failed = new Promise<never>((_, reject) => {
      worker.addEventListener('error', (event) => reject(new Error(event.message)));
    });
    failed.catch(() => undefined);
    this.#facts = await Promise.race([api.start(module, encoder), failed]);
    return { worker, api, failed };
  }
}
