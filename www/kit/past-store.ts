import { type DBSchema, type IDBPDatabase, openDB } from 'idb';

/** A pile that taught. What was gathered from it lies apart. */
export interface PastPile {
  id: string;
  /** When it taught, in milliseconds since 1970. */
  date: number;
  encoder: string;
  /** Trays with an answer. */
  categories: number;
  /** Answers. */
  items: number;
}

/** What is known of a starter without reading its file. */
export interface StarterFacts {
  /** Its place in the store: one for what this device's piles taught, and one for each file that was opened. */
  key: string;
  identity: string;
  encoder: string;
  /** The file's name; absent for what this device's piles taught. */
  name: string | undefined;
  /** When it was learned or opened, in milliseconds since 1970. */
  date: number;
  categories: number;
  items: number;
  /** The past piles of this device it was learned from. */
  piles: readonly string[];
}

export interface KeptStarter extends StarterFacts {
  file: Uint8Array<ArrayBuffer>;
}

/** Stands for starting from nothing. */
export const NOTHING = 'nothing';

/** Where the starter lies that was learned from this device's piles. */
export function ownKey(encoder: string): string {
  return `own ${encoder}`;
}

interface Schema extends DBSchema {
  piles: { key: string; value: PastPile };
  /** By pile: sums, and the embeddings of some items. */
  gathered: { key: string; value: Uint8Array<ArrayBuffer> };
  starters: { key: string; value: StarterFacts };
  files: { key: string; value: Uint8Array<ArrayBuffer> };
  /** By encoder: the key of the starter that the next pile starts from, or `NOTHING`. */
  choices: { key: string; value: string };
}

const STORES = ['piles', 'gathered', 'starters', 'files', 'choices'] as const;

/** What past piles taught, on this device. What is large lies apart from what is known of it, so that lists are read fast. */
export class PastStore {
  readonly #database: IDBPDatabase<Schema>;

  private constructor(database: IDBPDatabase<Schema>) {
    this.#database = database;
  }

  /** `name` is that of the pile's store. */
  static async open(name: string): Promise<PastStore> {
    return new PastStore(
      await openDB<Schema>(`${name} past`, 1, {
        upgrade(database) {
          database.createObjectStore('piles', { keyPath: 'id' });
          database.createObjectStore('gathered');
          database.createObjectStore('starters', { keyPath: 'key' });
          database.createObjectStore('files');
          database.createObjectStore('choices');
        },
      }),
    );
  }

  async lists(): Promise<{ piles: PastPile[]; starters: StarterFacts[]; choices: Map<string, string> }> {
    const transaction = this.#database.transaction(['piles', 'starters', 'choices']);
    const [piles, starters, encoders, chosen] = await Promise.all([
      transaction.objectStore('piles').getAll(),
      transaction.objectStore('starters').getAll(),
      transaction.objectStore('choices').getAllKeys(),
      transaction.objectStore('choices').getAll(),
      transaction.done,
    ]);
    const choices = new Map(encoders.map((encoder, index) => [encoder, chosen[index] ?? NOTHING]));
    return { piles: piles.sort((a, b) => a.date - b.date), starters: starters.sort((a, b) => a.date - b.date), choices };
  }

  async gathered(pile: string): Promise<Uint8Array<ArrayBuffer> | undefined> {
    return this.#database.get('gathered', pile);
  }

  async starter(key: string): Promise<KeptStarter | undefined> {
    const transaction = this.#database.transaction(['starters', 'files']);
    const [facts, file] = await Promise.all([
      transaction.objectStore('starters').get(key),
      transaction.objectStore('files').get(key),
      transaction.done,
    ]);
    return facts && file && { ...facts, file };
  }

  /** What a new pile of this encoder's items starts from. */
  async forNext(encoder: string): Promise<KeptStarter | undefined> {
    const key = (await this.#database.get('choices', encoder)) ?? ownKey(encoder);
    return key === NOTHING ? undefined : this.starter(key);
  }

  async choose(encoder: string, key: string): Promise<void> {
    await this.#database.put('choices', key, encoder);
  }

  /** Keeps what was gathered from a pile and the starter learned with it, and starts the next pile from it: all of it or nothing. */
  async teach(pile: PastPile, gathered: Uint8Array<ArrayBuffer>, starter: KeptStarter): Promise<void> {
    const transaction = this.#database.transaction(STORES, 'readwrite');
    const { file, ...facts } = starter;
    await Promise.all([
      transaction.objectStore('piles').put(pile),
      transaction.objectStore('gathered').put(gathered, pile.id),
      transaction.objectStore('starters').put(facts),
      transaction.objectStore('files').put(file, facts.key),
      transaction.objectStore('choices').put(facts.key, facts.encoder),
      transaction.done,
    ]);
  }

  /** Forgets a pile, and replaces what was learned with it, or deletes that if nothing is left to learn from. */
  async forget(pile: string, key: string, starter: KeptStarter | undefined): Promise<void> {
    const transaction = this.#database.transaction(STORES, 'readwrite');
    const requests: Promise<unknown>[] = [transaction.objectStore('piles').delete(pile), transaction.objectStore('gathered').delete(pile)];
    if (starter) {
      const { file, ...facts } = starter;
      requests.push(transaction.objectStore('starters').put(facts), transaction.objectStore('files').put(file, key));
    } else {
      requests.push(transaction.objectStore('starters').delete(key), transaction.objectStore('files').delete(key));
    }
    await Promise.all([...requests, transaction.done]);
  }

  /** Keeps a starter that was opened, and starts the next pile from it. */
  async take(starter: KeptStarter): Promise<void> {
    const transaction = this.#database.transaction(['starters', 'files', 'choices'], 'readwrite');
    const { file, ...facts } = starter;
    await Promise.all([
      transaction.objectStore('starters').put(facts),
      transaction.objectStore('files').put(file, facts.key),
      transaction.objectStore('choices').put(facts.key, facts.encoder),
      transaction.done,
    ]);
  }

  async drop(key: string): Promise<void> {
    const transaction = this.#database.transaction(['starters', 'files', 'choices'], 'readwrite');
    const choices = transaction.objectStore('choices');
    for (let cursor = await choices.openCursor(); cursor; cursor = await cursor.continue()) {
      if (cursor.value === key) await cursor.delete();
    }
    await Promise.all([transaction.objectStore('starters').delete(key), transaction.objectStore('files').delete(key), transaction.done]);
  }

  async clear(): Promise<void> {
    const transaction = this.#database.transaction(STORES, 'readwrite');
    await Promise.all([...STORES.map((store) => transaction.objectStore(store).clear()), transaction.done]);
  }

  close(): void {
    this.#database.close();
  }
}
