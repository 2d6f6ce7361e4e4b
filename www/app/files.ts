import type { Source } from '../kit/client';
import { words } from './words';

export interface Found {
  sources: Source[];
  /** One line each. */
  problems: string[];
}

/** Files that systems leave in folders and nobody means to add. */
function isLitter(name: string): boolean {
  return name.startsWith('.') || /^(thumbs\.db|desktop\.ini|__macosx)$/i.test(name);
}

function inOrder(found: Found): Found {
  const order = new Intl.Collator('en', { numeric: true });
  found.sources.sort((a, b) => order.compare(a.name, b.name));
  return found;
}

function fileOf(entry: FileSystemFileEntry): Promise<File> {
  return new Promise((resolve, reject) => entry.file(resolve, reject));
}

async function children(folder: FileSystemDirectoryEntry): Promise<FileSystemEntry[]> {
  const reader = folder.createReader();
  const all: FileSystemEntry[] = [];
  for (;;) {
    // Browsers hand out at most 100 entries a call.
    const some = await new Promise<FileSystemEntry[]>((resolve, reject) => reader.readEntries(resolve, reject));
    if (some.length === 0) return all;
    all.push(...some);
  }
}

async function walk(entry: FileSystemEntry, found: Found): Promise<number> {
  if (isLitter(entry.name)) return 0;
  if (entry.isFile) {
    found.sources.push({ name: entry.fullPath.replace(/^\//, ''), blob: () => fileOf(entry as FileSystemFileEntry) });
    return 1;
  }
  let files = 0;
  for (const child of await children(entry as FileSystemDirectoryEntry)) files += await walk(child, found);
  return files;
}

/** What was dropped or pasted, folders with all that is in them. */
export async function fromTransfer(transfer: DataTransfer): Promise<Found> {
  const found: Found = { sources: [], problems: [] };
  // Entries and files are only there until the first `await`.
  const given = [...transfer.items]
    .filter((item) => item.kind === 'file')
    .map((item) => ({ entry: item.webkitGetAsEntry(), file: item.getAsFile() }));
  for (const { entry, file } of given) {
    if (entry?.isDirectory) {
      const files = await walk(entry, found);
      if (files === 0) found.problems.push(words.emptyFolder(entry.name));
    } else if (file) {
      found.sources.push({ name: file.name, blob: file });
    }
  }
  if (given.length === 0) found.problems.push(words.nothingDropped);
  return inOrder(found);
}

/** What was chosen in a file dialog; a folder's files carry their path in it. */
export function fromList(list: FileList, folder: boolean): Found {
  const files = [...list].filter((file) => !isLitter(file.name));
  const sources = files.map((file) => ({ name: file.webkitRelativePath || file.name, blob: file }));
  const problems = folder && sources.length === 0 ? [words.emptyFolder('The folder')] : [];
  return inOrder({ sources, problems });
}

/** Pasted pictures all come under the same name. */
export function fromClipboard(transfer: DataTransfer, pasted: number): Source[] {
  return [...transfer.files].map((file, index) => {
    const dot = file.name.lastIndexOf('.');
    const ending = dot < 0 ? '' : file.name.slice(dot);
    return { name: /^image\.\w+$/.test(file.name) ? `pasted-${pasted + index + 1}${ending}` : file.name, blob: file };
  });
}

interface DemoIndex {
  title: string;
  about: string;
  items: { file: string }[];
}

/** The demo pile of notes and the column they stand in. */
export const demoNotes = {
  column: 'note',
  source: {
    name: 'log.csv',
    blob: async (): Promise<Blob> => {
      const response = await fetch(new URL('./demo/notes/log.csv', document.baseURI)).catch(() => undefined);
      if (!response?.ok) throw new Error(words.demoMissing);
      return response.blob();
    },
  } satisfies Source,
};

const demoFolder = new URL('./demo/pile/', document.baseURI);

export async function demoIndex(): Promise<DemoIndex> {
  const response = await fetch(new URL('index.json', demoFolder));
  if (!response.ok) throw new Error(words.demoMissing);
  return (await response.json()) as DemoIndex;
}

export function demoUrl(file: string): string {
  return new URL(file, demoFolder).href;
}

export async function demoSources(): Promise<Source[]> {
  const { items } = await demoIndex().catch(() => Promise.reject(new Error(words.demoMissing)));
  return items.map(({ file }) => ({
    name: file,
    blob: async () => {
      const response = await fetch(demoUrl(file));
      if (!response.ok) throw new Error(words.demoMissing);
      return response.blob();
    },
  }));
}
