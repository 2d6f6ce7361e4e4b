import { Aside, type CheckView, Status } from '../kit/client';
import { csv } from '../kit/csv';
import type { Desk } from './desk';
import { asideOf, plausibleOf } from './view';
import { words } from './words';

const FILE = 'sorted-pile.csv';

/** What the spot check said of each item it looked at, if its statement is about the pile as it is. */
function checked(check: CheckView | undefined): Map<number, string> | undefined {
  if (!check?.statement || !check.aboutNow) return undefined;
  const said = words.trust.judged;
  return new Map(check.sample.map(({ item, judgement }) => [item, typeof judgement === 'string' ? said[judgement] : said.belongs]));
}

/** The columns that the result adds; the last one only where a spot check is about it. */
function columns(check: CheckView | undefined): string[] {
  const { plausible, aside, checked: spotCheck } = words.trust.columns;
  return ['tray', 'probability', plausible, aside, ...(checked(check) ? [spotCheck] : [])];
}

/** What the result says of each item, in the order of `columns`; no tray for what is not sorted or set aside, `null` for what was taken out. */
function finder(desk: Desk): (number: number) => string[] | null {
  const { snapshot } = desk;
  if (!snapshot) return () => null;
  const { tray, probability, status } = snapshot.verdicts;
  const said = checked(snapshot.check);
  return (number) => {
    if (status[number] === Status.removed) return null;
    const reason = asideOf(snapshot.verdicts, number);
    const placed = reason === Aside.not ? (tray[number] ?? -1) : -1;
    const plausible = status[number] === Status.none ? '' : plausibleOf(snapshot, number).map((one) => desk.trayName(one)).join('; ');
    const aside = status[number] === Status.none ? words.trust.byYou : (words.reasons[reason] ?? '');
    return [
      placed < 0 ? '' : desk.trayName(placed),
      placed < 0 ? '' : (probability[number] ?? 0).toFixed(4),
      plausible,
      aside,
      ...(said ? [said.get(number) ?? ''] : []),
    ];
  };
}

/** Saves the result as a table: photos one a line, notes as the rows they came in. Resolves to the file's name. */
export async function handOver(desk: Desk): Promise<string> {
  const added = columns(desk.snapshot?.check);
  const found = finder(desk);
  if (desk.kind === 'notes') {
    save(await desk.client.handBack(added, found), FILE);
    return FILE;
  }
  const rows = desk.items.flatMap(({ number, name }) => {
    const cells = found(number);
    return cells ? [[name, ...cells]] : [];
  });
  save(new Blob([csv([['item', ...added], ...rows])], { type: 'text/csv' }), FILE);
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
