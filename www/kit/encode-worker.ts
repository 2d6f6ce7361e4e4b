import * as Comlink from 'comlink';
import { expose } from './bridge';
import { PhotoEncoder, startCore } from './core';
import { codeOf } from './error';

export interface EncoderFacts {
  identity: string;
  dimension: number;
  nonNegative: boolean;
}

export interface ReadPhoto {
  embedding: Float32Array<ArrayBuffer>;
  /** A JPEG file. */
  thumbnail: Uint8Array<ArrayBuffer>;
  width: number;
  height: number;
  /** The same for two files with the same content. */
  fingerprint: string;
}

/** No camera makes larger pictures; beyond it the canvas of a browser fails in ways that can't be caught. */
const LARGEST_BITMAP = 100_000_000;

let encoder: PhotoEncoder | undefined;

function started(): PhotoEncoder {
  if (!encoder) throw new Error('the encoder has not been started');
  return encoder;
}

/** Formats that the core does not decode but this browser does (AVIF, HEIC on some devices). */
async function pixels(photo: Blob): Promise<ImageData | undefined> {
  const bitmap = await createImageBitmap(photo).catch(() => undefined);
  if (!bitmap) return undefined;
  try {
    if (bitmap.width * bitmap.height > LARGEST_BITMAP) return undefined;
    const context = new OffscreenCanvas(bitmap.width, bitmap.height).getContext('2d');
    context?.drawImage(bitmap, 0, 0);
    return context?.getImageData(0, 0, bitmap.width, bitmap.height);
  } finally {
    bitmap.close();
  }
}

const api = {
  async start(module: WebAssembly.Module, file: Uint8Array): Promise<EncoderFacts> {
    await startCore(module);
    encoder = new PhotoEncoder(file);
    return { identity: encoder.identity, dimension: encoder.dimension, nonNegative: encoder.nonNegative };
  },

  async read(photo: Blob, thumbnailSide: number): Promise<ReadPhoto> {
    const bytes = new Uint8Array(await photo.arrayBuffer());
    let result;
    try {
      result = started().read(bytes, thumbnailSide);
    } catch (error) {
      const image = codeOf(error) === 'not-an-image' ? await pixels(photo) : undefined;
      if (!image) throw error;
      result = started().readPixels(new Uint8Array(image.data.buffer), image.width, image.height, thumbnailSide);
    }
    try {
      const read = {
        embedding: result.embedding() as Float32Array<ArrayBuffer>,
        thumbnail: result.thumbnail() as Uint8Array<ArrayBuffer>,
        width: result.width,
        height: result.height,
        fingerprint: result.fingerprint,
      };
      return Comlink.transfer(read, [read.embedding.buffer, read.thumbnail.buffer]);
    } finally {
      result.free();
    }
  },
};

export type EncodeApi = typeof api;

expose(api);
