import { type DBSchema, deleteDB, type IDBPDatabase, openDB } from 'idb';
import { KenspeckleError } from './error';

/** A kit as lists show it: its pile, trays and answers lie in a database of their own. */
export interface Kit {
  /** The name of its database. */
  id: string;
  name: string;
  /** The identity of the encoder whose embeddings it sorts. */
  encoder: string;
  items: number;
  trays: number;
  answers: number;
  /** When it changed last, in milliseconds since 1970. */
  date: number;
}

interface Schema extends DBSchema {
  kits: { key: string; value: Kit };
}

/** The lock by which one tab at a time owns a kit. */
export function lockOf(id: string): string {
  return `pile ${id}`;
}

/** The kits on this device, by name. Each sorts the embeddings of one encoder, so photos and notes never meet. */
export class Kits {
  readonly #name: string;
  readonly #database: IDBPDatabase<Schema>;
  #list: Kit[] = [];

  private constructor(name: string, database: IDBPDatabase<Schema>) {
    this.#name = name;
    this.#database = database;
  }

  /** Fails where the browser keeps nothing for the page. */
  static async open(name = 'kenspeckle'): Promise<Kits> {
    const database = await openDB<Schema>(`${name} kits`, 1, {
      upgrade: (created) => void created.createObjectStore('kits', { keyPath: 'id' }),
    });
    const kits = new Kits(name, database);
    await kits.read();
    return kits;
  }

  /** All kits, the one that changed last first. */
  get list(): readonly Kit[] {
    return this.#list;
  }

  find(id: string): Kit | undefined {
    return this.#list.find((kit) => kit.id === id);
  }

  /** An identity for a kit to come: the first that no kit and no tab has. What an interrupted visit left there comes back. */
  async newId(): Promise<string> {
    const { held = [] } = await navigator.locks.query();
    const taken = new Set(held.map((lock) => lock.name));
    for (let number = 1; ; number++) {
      const id = number === 1 ? this.#name : `${this.#name} ${number}`;
      if (!this.find(id) && !taken.has(lockOf(id))) return id;
    }
  }

  /** A name that no other kit has. */
  free(name: string, except?: string): string {
    const taken = new Set(this.#list.filter(({ id }) => id !== except).map((kit) => kit.name));
    for (let number = 2; ; number++) {
      const tried = number === 2 && !taken.has(name) ? name : `${name} ${number}`;
      if (!taken.has(tried)) return tried;
    }
  }

  /** Reads the list anew: another tab may have changed it. */
  async read(): Promise<void> {
    const all = await this.#database.getAll('kits');
    this.#list = all.sort((a, b) => b.date - a.date);
  }

  /** Writes what is known of a kit; a kit that is known keeps its name. `name` is for one that is not. */
  async note(facts: Omit<Kit, 'name' | 'date'>, name: string): Promise<void> {
    const transaction = this.#database.transaction('kits', 'readwrite');
    const known = await transaction.store.get(facts.id);
    await transaction.store.put({ ...facts, name: known?.name ?? this.free(name), date: Date.now() });
    await transaction.done;
    await this.read();
  }

  async rename(id: string, name: string): Promise<void> {
    const transaction = this.#database.transaction('kits', 'readwrite');
    const known = await transaction.store.get(id);
    if (known) await transaction.store.put({ ...known, name });
    await transaction.done;
    await this.read();
  }

  /** Takes a kit off the list; what lies in its database stays. */
  async forget(id: string): Promise<void> {
    await this.#database.delete('kits', id);
    await this.read();
  }

  /** Deletes a kit and all that lies in it. Throws "pile-open-elsewhere". */
  async delete(id: string): Promise<void> {
    const done = await navigator.locks.request(lockOf(id), { ifAvailable: true }, async (lock) => {
      if (!lock) return false;
      await deleteDB(id);
      return true;
    });
    if (!done) throw new KenspeckleError('pile-open-elsewhere', 'This kit is open in another tab. Close that tab first.');
    await this.forget(id);
  }
}
