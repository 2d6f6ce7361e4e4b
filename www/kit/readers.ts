import { type Assets, bundledAssets, compileCore, fetchBytes } from './core';
import type { EncoderFacts } from './encode-worker';
import type { Arrival, Eyes, Unread } from './intake';
import { NoteReader } from './notes';
import { EncodePool } from './pool';

/** What reads photos and notes. One for all kits of a page, since encoders take time and memory to start. */
export class Readers implements Eyes {
  readonly assets: Assets;
  readonly module: Promise<WebAssembly.Module>;
  readonly notes: NoteReader;
  readonly #photos: EncodePool;
  readonly #thumbnailSide: number;

  /** `thumbnailSide`: longest side of the small pictures, in pixels. */
  constructor(assets: Assets = bundledAssets, thumbnailSide = 384) {
    this.assets = assets;
    this.#thumbnailSide = thumbnailSide;
    this.module = compileCore(assets.wasm);
    this.module.catch(() => undefined);
    this.notes = new NoteReader(assets, this.module);
    let encoder: Promise<Uint8Array> | undefined;
    this.#photos = new EncodePool(async () => {
      encoder ??= fetchBytes(assets.photoEncoder);
      try {
        return { module: await this.module, encoder: await encoder };
      } catch (error) {
        encoder = undefined;
        throw error;
      }
    });
  }

  get size(): number {
    return this.#photos.size;
  }

  /** Loads the photo encoder ahead of the first photo. */
  async warm(): Promise<void> {
    await this.#photos.warm();
  }

  /** The identities of the encoders there are. Loads the photo encoder. */
  async identities(): Promise<string[]> {
    await this.warm();
    return [this.#photos.facts.identity, this.assets.textIdentity];
  }

  async read(source: Unread): Promise<Arrival> {
    if ('text' in source) return { source, read: await this.notes.read(source.text, source.name) };
    const blob = typeof source.blob === 'function' ? await source.blob() : source.blob;
    return { source, blob, read: await this.#photos.read(blob, source.name, this.#thumbnailSide) };
  }

  /** Of the encoder that read this. */
  facts(arrival: Arrival): EncoderFacts {
    return 'blob' in arrival ? this.#photos.facts : this.notes.facts;
  }
}
