/** What a part of the page asks the page to do. Crosses shadow roots. */
export function tell<T>(from: HTMLElement, type: string, detail: T): void {
  from.dispatchEvent(new CustomEvent(type, { detail, bubbles: true, composed: true }));
}

/** The key that names a tray by its place, as far as there are keys. */
export function trayKey(place: number): string | undefined {
  return place < 9 ? String(place + 1) : place === 9 ? '0' : undefined;
}

/** The kind under which an item's number travels when it is dragged. */
export const ITEM_TYPE = 'application/x-kenspeckle-item';
