import { Status } from '../kit/client';
import { csv } from '../kit/csv';
import type { Desk } from './desk';

const FILE = 'sorted-pile.csv';

/** One line an item; no tray for what is not sorted or set aside. */
function rows(desk: Desk): string[][] {
  if (!desk.snapshot) return [];
  const { tray, probability, status } = desk.snapshot.verdicts;
  return desk.items
    .filter(({ number }) => status[number] !== Status.removed)
    .map(({ number, name }) => {
      const placed = tray[number] ?? -1;
      return placed < 0 ? [name, '', ''] : [name, desk.trayName(placed), (probability[number] ?? 0).toFixed(4)];
    });
}

/** Saves the result as a table. Returns the file's name. */
export function handOver(desk: Desk): string {
  const table = csv([['item', 'tray', 'probability'], ...rows(desk)]);
  save(new Blob([table], { type: 'text/csv' }), FILE);
  return FILE;
}

/** Gives the person a file. */
export function save(file: Blob, name: string): void {
  const url = URL.createObjectURL(file);
  const link = document.createElement('a');
  link.href = url;
  link.download = name;
  link.click();
  // The browser reads it after the click; how long after is its own affair.
  setTimeout(() => URL.revokeObjectURL(url), 60_000);
}
