import { type Kit, Kits, PileClient, type Readers } from '../kit/client';
import { Desk } from './desk';
import { words } from './words';

/** The kit that was open last. */
const LAST = 'kit';
/** How long changes gather before the list hears of them, in milliseconds. */
const NOTE_AFTER = 400;

/** The kits of this device, and the one on the bench. */
export class BenchKits {
  readonly #readers: Readers;
  readonly #redraw: () => void;
  readonly #kits: Kits | undefined;
  /** The kit on the bench. A new one is on the list once something lies in it. */
  id: string;
  /** What a new kit is to be called. */
  #suggested = '';
  #soon: ReturnType<typeof setTimeout> | undefined;
  #noted: unknown;

  private constructor(readers: Readers, redraw: () => void, kits: Kits | undefined, id: string) {
    this.#readers = readers;
    this.#redraw = redraw;
    this.#kits = kits;
    this.id = id;
  }

  static async open(readers: Readers, redraw: () => void): Promise<BenchKits> {
    const kits = await Kits.open().catch(() => undefined);
    return new BenchKits(readers, redraw, kits, localStorage.getItem(LAST) ?? (await kits?.newId()) ?? 'kenspeckle');
  }

  /** Whether this browser keeps kits. */
  get kept(): boolean {
    return this.#kits !== undefined;
  }

  get list(): readonly Kit[] {
    return this.#kits?.list ?? [];
  }

  get others(): readonly Kit[] {
    return this.list.filter(({ id }) => id !== this.id);
  }

  /** The name of the kit on the bench. */
  nameOf(desk: Desk | undefined): string {
    return this.#kits?.find(this.id)?.name ?? (this.#suggested || words.newKitName[desk?.kind ?? 'photos']);
  }

  /** Names a kit that has no name yet. */
  suggest(name: string): void {
    this.#suggested ||= name;
  }

  /** Lays the kit on the bench. */
  async lay(): Promise<Desk> {
    const client = await PileClient.open({ name: this.id, readers: this.#readers });
    const desk = await Desk.lay(client, this.#redraw);
    localStorage.setItem(LAST, this.id);
    if (desk.snapshot) await this.#note(desk);
    return desk;
  }

  /** Puts the desk's kit away; the next one to be laid is the one named, or a new one. */
  async change(desk: Desk | undefined, id?: string): Promise<void> {
    await this.#flush(desk);
    await desk?.client.close();
    await this.#kits?.read();
    this.#suggested = '';
    this.#noted = undefined;
    this.id = id ?? (await this.#kits?.newId()) ?? this.id;
    localStorage.setItem(LAST, this.id);
  }

  /** Keeps the list true after the desk changed. */
  watch(desk: Desk): void {
    if (!desk.snapshot || desk.snapshot === this.#noted || !this.#kits) return;
    if (!this.#kits.find(this.id)) return void this.#note(desk);
    this.#soon ??= setTimeout(() => void this.#note(desk), NOTE_AFTER);
  }

  async rename(id: string, name: string): Promise<void> {
    await this.#kits?.rename(id, name);
    this.#redraw();
  }

  /** Takes the kit on the bench off the list, after its pile was deleted. */
  async forget(): Promise<void> {
    clearTimeout(this.#soon);
    this.#soon = undefined;
    this.#suggested = '';
    await this.#kits?.forget(this.id);
    this.#redraw();
  }

  /** Deletes another kit than the one on the bench. Throws "pile-open-elsewhere". */
  async delete(id: string): Promise<void> {
    await this.#kits?.delete(id);
    this.#redraw();
  }

  async #flush(desk: Desk | undefined): Promise<void> {
    clearTimeout(this.#soon);
    if (desk?.snapshot && desk.snapshot !== this.#noted) await this.#note(desk);
  }

  async #note(desk: Desk): Promise<void> {
    this.#soon = undefined;
    const { snapshot, view } = desk;
    if (!snapshot || !view) return;
    this.#noted = snapshot;
    const facts = { id: this.id, encoder: snapshot.encoder, items: view.tally.items, trays: snapshot.trays.length, answers: desk.answers };
    await this.#kits?.note(facts, this.nameOf(desk)).catch(() => undefined);
    this.#redraw();
  }
}
