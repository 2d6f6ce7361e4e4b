import * as Comlink from 'comlink';
import type { Hindsight } from './core';
import type { HindsightApi } from './hindsight-worker';
import type { Watched } from './past';
import type { PileCopy } from './sort-worker';

/** Works in a worker of its own, which is there only as long as it works: answering goes on meanwhile. */
export async function hindsightOf(copy: PileCopy, module: WebAssembly.Module, { signal, onProgress }: Watched = {}): Promise<Hindsight> {
  signal?.throwIfAborted();
  const worker = new Worker(new URL('./hindsight-worker.ts', import.meta.url), { type: 'module' });
  try {
    const ended = new Promise<never>((_, reject) => {
      signal?.addEventListener('abort', () => reject(signal.reason as Error));
      worker.addEventListener('error', (event) => reject(new Error(event.message)));
    });
    ended.catch(() => undefined);
    const report = Comlink.proxy((done: number) => onProgress?.(done));
    const found = Comlink.wrap<HindsightApi>(worker).look(module, Comlink.transfer(copy, [copy.embeddings.buffer]), report);
    return await Promise.race([found, ended]);
  } finally {
    // In the middle of a computation nothing else stops it, and it keeps nothing.
    worker.terminate();
  }
}
