import { Aside, type Item, type Snapshot, Status, type Verdicts } from '../kit/client';

/** From here on an item stands at the back of its shelf. Only for the look: nothing is decided by it. */
export const SURE = 0.8;

export interface ShelfView {
  /** −1: not sorted; −2: set aside. */
  tray: number;
  name: string;
  /** Index in order of creation; its key is one more. */
  place: number;
  answers: number;
  /** Answered ones, then the surest first. */
  back: number[];
  /** The least sure first. */
  front: number[];
}

export interface Tally {
  items: number;
  answered: number;
  sure: number;
  unsure: number;
  unsorted: number;
  aside: number;
}

/** Why the sorter sets an item aside; `Aside.not` also for what the person spoke of. */
export function asideOf(verdicts: Verdicts, item: number): number {
  return verdicts.setAside[item] ?? Aside.not;
}

/** The trays that can't be ruled out for an item, most probable first. */
export function plausibleOf({ plausible }: Snapshot, item: number): number[] {
  return [...plausible.trays.subarray(plausible.starts[item] ?? 0, plausible.starts[item + 1] ?? 0)];
}

export interface BenchView {
  shelves: ShelfView[];
  pile: number[];
  /** By the person. */
  aside: number[];
  /** By the sorter, by reason. */
  asideBySorter: number[];
  tally: Tally;
}

/** Lays a snapshot out on shelves. */
export function layOut(snapshot: Snapshot, items: readonly Item[]): BenchView {
  const { tray, probability, status } = snapshot.verdicts;
  const shelves = snapshot.trays.map(
    (of, place): ShelfView => ({ tray: of.tray, name: of.name, place, answers: of.answers, back: [], front: [] }),
  );
  const byTray = new Map(shelves.map((shelf) => [shelf.tray, shelf]));
  const pile: number[] = [];
  const aside: number[] = [];
  const asideBySorter: number[] = [];
  const tally: Tally = { items: 0, answered: 0, sure: 0, unsure: 0, unsorted: 0, aside: 0 };
  for (let item = 0; item < Math.min(status.length, items.length); item++) {
    if (status[item] === Status.removed) continue;
    tally.items++;
    const shelf = byTray.get(tray[item] ?? -1);
    if (status[item] === Status.none) {
      aside.push(item);
      tally.aside++;
    } else if (asideOf(snapshot.verdicts, item) !== Aside.not) {
      asideBySorter.push(item);
      tally.aside++;
    } else if (!shelf) {
      pile.push(item);
      tally.unsorted++;
    } else if (status[item] === Status.answered) {
      shelf.back.push(item);
      tally.answered++;
    } else if ((probability[item] ?? 0) >= SURE) {
      shelf.back.push(item);
      tally.sure++;
    } else {
      shelf.front.push(item);
      tally.unsure++;
    }
  }
  const surer = (a: number, b: number) =>
    Number(status[b] === Status.answered) - Number(status[a] === Status.answered) ||
    (probability[b] ?? 0) - (probability[a] ?? 0) ||
    a - b;
  for (const shelf of shelves) {
    shelf.back.sort(surer);
    shelf.front.sort((a, b) => -surer(a, b));
  }
  asideBySorter.sort((a, b) => asideOf(snapshot.verdicts, a) - asideOf(snapshot.verdicts, b) || a - b);
  return { shelves, pile, aside, asideBySorter, tally };
}

/** The shelf an item is on. */
function placeOf(verdicts: Verdicts, item: number): number | 'aside' | undefined {
  return asideOf(verdicts, item) === Aside.not ? verdicts.tray[item] : 'aside';
}

/** Items other than `except` that the sorter put elsewhere than before. */
export function moved(before: Snapshot | undefined, after: Snapshot, except: readonly number[]): Set<number> {
  const result = new Set<number>();
  if (!before) return result;
  const length = Math.min(before.verdicts.tray.length, after.verdicts.tray.length);
  for (let item = 0; item < length; item++) {
    if (!except.includes(item) && placeOf(before.verdicts, item) !== placeOf(after.verdicts, item)) result.add(item);
  }
  return result;
}

/** The items whose answer differs, so that undo can show what it undid. */
export function changedAnswers(before: Snapshot, after: Snapshot): number[] {
  const changed: number[] = [];
  const a = before.verdicts;
  const b = after.verdicts;
  for (let item = 0; item < Math.min(a.status.length, b.status.length); item++) {
    const differs = a.status[item] !== b.status[item];
    if (differs || (b.status[item] === Status.answered && a.tray[item] !== b.tray[item])) changed.push(item);
  }
  return changed;
}
