import * as Comlink from 'comlink';
import { codeOf } from './error';

/**
 * Exposes a worker's API. Errors keep their `code` on the way across, which Comlink drops.
 */
export function expose(api: object): void {
  const thrown = Comlink.transferHandlers.get('throw');
  if (!thrown) throw new Error('this Comlink has no handler for errors');
  Comlink.transferHandlers.set('throw', {
    ...thrown,
    serialize(value: unknown) {
      const [serialized, transfer] = thrown.serialize(value) as [
        { isError: boolean; value: Record<string, unknown> },
        Transferable[],
      ];
      const code = codeOf((value as { value: unknown }).value);
      if (serialized.isError && code) serialized.value['code'] = code;
      return [serialized, transfer];
    },
  });
  Comlink.expose(api);
}
