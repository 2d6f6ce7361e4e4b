/** An error for people: `code` is for programs, `message` names the item and the remedy. */
export class KenspeckleError extends Error {
  readonly code: string;

  constructor(code: string, message: string) {
    super(message);
    this.name = 'KenspeckleError';
    this.code = code;
  }
}

/** The code of an error made here, in a worker, or in the WebAssembly module; `undefined` for any other error. */
export function codeOf(error: unknown): string | undefined {
  if (typeof error !== 'object' || error === null || !('code' in error)) return undefined;
  return typeof error.code === 'string' ? error.code : undefined;
}

export function messageOf(error: unknown): string {
  return error instanceof Error ? error.message : String(error);
}
