export type Command =
  | { do: 'tray'; place: number }
  | { do: 'guess' | 'find' | 'none' | 'skip' | 'undo' | 'redo' | 'zoom' | 'back' | 'remove' | 'help' | 'shelves' | 'past' | 'strips' | 'trust' | 'kits' };

const single: Record<string, Command> = {
  enter: { do: 'guess' },
  t: { do: 'find' },
  '/': { do: 'find' },
  n: { do: 'none' },
  c: { do: 'skip' },
  u: { do: 'undo' },
  s: { do: 'strips' },
  z: { do: 'zoom' },
  q: { do: 'back' },
  p: { do: 'past' },
  h: { do: 'trust' },
  k: { do: 'kits' },
  delete: { do: 'remove' },
  backspace: { do: 'remove' },
  '?': { do: 'help' },
  arrowleft: { do: 'shelves' },
  arrowright: { do: 'shelves' },
};

/** Fields and lists have keys of their own. */
export function isTyping(event: Event): boolean {
  const target = event.composedPath()[0];
  return target instanceof HTMLInputElement || target instanceof HTMLSelectElement || target instanceof HTMLTextAreaElement;
}

function isControl(event: Event): boolean {
  const target = event.composedPath()[0];
  return target instanceof HTMLButtonElement || target instanceof HTMLAnchorElement || (target instanceof Element && target.matches('summary'));
}

/** What a key asks for; `undefined`: not ours. Single keys can be switched off (WCAG 2.2, 2.1.4). */
export function commandOf(event: KeyboardEvent, singleKeys: boolean): Command | undefined {
  if (event.isComposing || isTyping(event)) return undefined;
  const key = event.key.toLowerCase();
  if ((event.ctrlKey || event.metaKey) && !event.altKey) {
    if (key === 'z') return { do: event.shiftKey ? 'redo' : 'undo' };
    return key === 'y' && !event.shiftKey ? { do: 'redo' } : undefined;
  }
  if (event.ctrlKey || event.metaKey || event.altKey || !singleKeys) return undefined;
  if (key === 'enter' && isControl(event)) return undefined;
  if (/^[0-9]$/.test(key)) return { do: 'tray', place: key === '0' ? 9 : Number(key) - 1 };
  if (key === 'u' && event.shiftKey) return { do: 'redo' };
  return single[key];
}
