import { type DBSchema, type IDBPDatabase, openDB } from 'idb';
import type { EncoderFacts } from './encode-worker';

/** One item of the pile as it lies in the store. `number` is its number in the sorter. */
export interface StoredItem {
  number: number;
  name: string;
  fingerprint: string;
  width: number;
  height: number;
  embedding: Float32Array<ArrayBuffer>;
}

export interface StoredPictures {
  thumbnail: Blob;
  /** Absent when the device has no room for it. */
  original?: Blob;
}

export interface Addition {
  item: StoredItem;
  pictures: StoredPictures;
}

/** What the sorter was, in its own words, and whose embeddings it sorts. */
export interface StoredState {
  sorter: string;
  encoder: EncoderFacts;
}

interface Schema extends DBSchema {
  items: { key: number; value: StoredItem };
  thumbnails: { key: number; value: Blob };
  originals: { key: number; value: Blob };
  state: { key: 'pile'; value: StoredState };
}

/** The pile on this device: IndexedDB, one database, every change in one transaction. */
export class Store {
  readonly #database: IDBPDatabase<Schema>;

  private constructor(database: IDBPDatabase<Schema>) {
    this.#database = database;
  }

  static async open(name: string): Promise<Store> {
    return new Store(
      await openDB<Schema>(name, 1, {
        upgrade(database) {
          database.createObjectStore('items', { keyPath: 'number' });
          database.createObjectStore('thumbnails');
          database.createObjectStore('originals');
          database.createObjectStore('state');
        },
      }),
    );
  }

  /** All items in order of their numbers, and the sorter's state; the state is missing for an empty store. */
  async load(): Promise<{ items: StoredItem[]; thumbnails: Map<number, Blob>; state: StoredState | undefined }> {
    const transaction = this.#database.transaction(['items', 'thumbnails', 'state']);
    const [items, keys, blobs, state] = await Promise.all([
      transaction.objectStore('items').getAll(),
      transaction.objectStore('thumbnails').getAllKeys(),
      transaction.objectStore('thumbnails').getAll(),
      transaction.objectStore('state').get('pile'),
      transaction.done,
    ]);
    const thumbnails = new Map<number, Blob>();
    keys.forEach((key, index) => {
      const blob = blobs[index];
      if (blob) thumbnails.set(key, blob);
    });
    return { items, thumbnails, state };
  }

  async original(number: number): Promise<Blob | undefined> {
    return this.#database.get('originals', number);
  }

  /** Adds items and replaces the state, if there is a new one: all of it or nothing. */
  async write(additions: readonly Addition[], state: StoredState | undefined): Promise<void> {
    const transaction = this.#database.transaction(['items', 'thumbnails', 'originals', 'state'], 'readwrite');
    const requests: Promise<unknown>[] = [];
    for (const { item, pictures } of additions) {
      requests.push(transaction.objectStore('items').put(item));
      requests.push(transaction.objectStore('thumbnails').put(pictures.thumbnail, item.number));
      if (pictures.original) requests.push(transaction.objectStore('originals').put(pictures.original, item.number));
    }
    if (state) requests.push(transaction.objectStore('state').put(state, 'pile'));
    await Promise.all([...requests, transaction.done]);
  }

  async clear(): Promise<void> {
    const names = ['items', 'thumbnails', 'originals', 'state'] as const;
    const transaction = this.#database.transaction(names, 'readwrite');
    await Promise.all([...names.map((name) => transaction.objectStore(name).clear()), transaction.done]);
  }

  close(): void {
    this.#database.close();
  }
}
