import { expose } from './bridge';
import { type Hindsight, Sorter, Starter, startCore } from './core';
import type { PileCopy } from './sort-worker';

const api = {
  /** Compares the copy's answers with random order. `report` hears how much is done, 0 to 1. */
  async look(module: WebAssembly.Module, { state, embeddings, starter }: PileCopy, report: (done: number) => void): Promise<Hindsight> {
    await startCore(module);
    const from = starter && Starter.read(starter);
    const sorter = Sorter.restore(state, embeddings, from);
    from?.free();
    return sorter.hindsight(report);
  },
};

export type HindsightApi = typeof api;

expose(api);
