import { type DBSchema, type IDBPDatabase, openDB } from 'idb';
import type { EncoderFacts } from './encode-worker';
import type { StoredCheck } from './checking';
import type { KeptStarter } from './past-store';

/** What is kept of a photo beside its pictures: pixels of the original. */
export interface PhotoFacts {
  width: number;
  height: number;
}

/** What is kept of a note. */
export interface NoteFacts {
  text: string;
  /** 1 unless the note was so long that it was read in parts and averaged. */
  parts: number;
}

/** One item of the pile as it lies in the store. `number` is its number in the sorter. */
export type StoredItem = {
  number: number;
  name: string;
  fingerprint: string;
  embedding: Float32Array<ArrayBuffer>;
} & (PhotoFacts | NoteFacts);

export interface StoredPictures {
  thumbnail: Blob;
  /** Absent when the device has no room for it. */
  original?: Blob;
}

/** A file that notes came from, kept whole, so that all of its columns can be handed back. */
export interface NoteFile {
  /** Its ending says how it is read. */
  name: string;
  file: Blob;
  /** The column that holds the notes. */
  column: string;
  /** The same for two files with the same content. */
  fingerprint: string;
}

/** A row of a file and the item that stands for it: several rows with the same text are one item. */
export interface NoteRow {
  file: number;
  row: number;
  item: number;
}

export interface Addition {
  item?: StoredItem;
  pictures?: StoredPictures;
  row?: NoteRow;
  file?: { number: number; file: NoteFile };
}

/** What the sorter was, in its own words, and whose embeddings it sorts. */
export interface StoredState {
  sorter: string;
  encoder: EncoderFacts;
  /** Names the pile among past piles; absent in what an older page kept. */
  id?: string;
  /** Whether the sorter starts from the pile's starter. */
  starts?: boolean;
  /** The pile's spot check, if it has one. */
  check?: StoredCheck | undefined;
}

/** What a change leaves to be written. The starter is written only when it is another one than before. */
export interface NewState extends StoredState {
  starter: KeptStarter | undefined;
}

interface Schema extends DBSchema {
  items: { key: number; value: StoredItem };
  thumbnails: { key: number; value: Blob };
  originals: { key: number; value: Blob };
  /** Of notes. */
  files: { key: number; value: NoteFile };
  rows: { key: [number, number]; value: NoteRow };
  state: { key: 'pile'; value: StoredState };
  /** The pile's own copy of what it starts from. */
  starter: { key: 'pile'; value: KeptStarter };
}

interface Loaded {
  items: StoredItem[];
  thumbnails: Map<number, Blob>;
  files: NoteFile[];
  rows: NoteRow[];
  state: NewState | undefined;
}

const STORES = ['items', 'thumbnails', 'originals', 'files', 'rows', 'state', 'starter'] as const;

/** The pile on this device: IndexedDB, one database, every change in one transaction. */
export class Store {
  readonly #database: IDBPDatabase<Schema>;
  /** The identity of the starter that lies in the store. */
  #starter: string | undefined;

  private constructor(database: IDBPDatabase<Schema>) {
    this.#database = database;
  }

  static async open(name: string): Promise<Store> {
    return new Store(
      await openDB<Schema>(name, 3, {
        upgrade(database, from) {
          if (from < 1) {
            database.createObjectStore('items', { keyPath: 'number' });
            database.createObjectStore('thumbnails');
            database.createObjectStore('originals');
            database.createObjectStore('state');
          }
          if (from < 2) database.createObjectStore('starter');
          database.createObjectStore('files');
          database.createObjectStore('rows', { keyPath: ['file', 'row'] });
        },
      }),
    );
  }

  /** All items in order of their numbers, and the sorter's state; the state is missing for an empty store. */
  async load(): Promise<Loaded> {
    const transaction = this.#database.transaction(['items', 'thumbnails', 'files', 'rows', 'state', 'starter']);
    const [items, keys, blobs, files, rows, state, starter] = await Promise.all([
      transaction.objectStore('items').getAll(),
      transaction.objectStore('thumbnails').getAllKeys(),
      transaction.objectStore('thumbnails').getAll(),
      transaction.objectStore('files').getAll(),
      transaction.objectStore('rows').getAll(),
      transaction.objectStore('state').get('pile'),
      transaction.objectStore('starter').get('pile'),
      transaction.done,
    ]);
    const thumbnails = new Map<number, Blob>();
    keys.forEach((key, index) => {
      const blob = blobs[index];
      if (blob) thumbnails.set(key, blob);
    });
    this.#starter = starter?.identity;
    return { items, thumbnails, files, rows, state: state && { ...state, starter } };
  }

  /** All items in order of their numbers. */
  async items(): Promise<StoredItem[]> {
    return this.#database.getAll('items');
  }

  async original(number: number): Promise<Blob | undefined> {
    return this.#database.get('originals', number);
  }

  /** Adds items and replaces the state, if there is a new one: all of it or nothing. */
  async write(additions: readonly Addition[], state: NewState | undefined): Promise<void> {
    const transaction = this.#database.transaction(STORES, 'readwrite');
    const requests: Promise<unknown>[] = [];
    for (const { item, pictures, row, file } of additions) {
      if (item) requests.push(transaction.objectStore('items').put(item));
      if (item && pictures) requests.push(transaction.objectStore('thumbnails').put(pictures.thumbnail, item.number));
      if (item && pictures?.original) requests.push(transaction.objectStore('originals').put(pictures.original, item.number));
      if (row) requests.push(transaction.objectStore('rows').put(row));
      if (file) requests.push(transaction.objectStore('files').put(file.file, file.number));
    }
    if (state) {
      const { starter, ...plain } = state;
      requests.push(transaction.objectStore('state').put(plain, 'pile'));
      if (starter && starter.identity !== this.#starter) requests.push(transaction.objectStore('starter').put(starter, 'pile'));
    }
    await Promise.all([...requests, transaction.done]);
    if (state?.starter) this.#starter = state.starter.identity;
  }

  async clear(): Promise<void> {
    const transaction = this.#database.transaction(STORES, 'readwrite');
    await Promise.all([...STORES.map((store) => transaction.objectStore(store).clear()), transaction.done]);
    this.#starter = undefined;
  }

  close(): void {
    this.#database.close();
  }
}
