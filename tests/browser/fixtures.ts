import { readFileSync } from 'node:fs';
import { join, resolve } from 'node:path';
import { test as base, type Download, expect, type Page } from '@playwright/test';
import { serve } from '../../pkg-scripts/serve.mjs';

export const root = resolve(import.meta.dirname, '../..');
export const demoFolder = join(root, 'www/demo/pile');

export interface DemoItem {
  file: string;
  /** Null for a stray. Only tests look at it. */
  tray: string | null;
}

export const demo = (JSON.parse(readFileSync(join(demoFolder, 'index.json'), 'utf8')) as { items: DemoItem[] }).items;
export const demoFile = (index: number): string => join(demoFolder, demo[index]?.file ?? '');

export interface Site {
  address: string;
  /** Takes the server away, so that an offline page can't reach it by any way. */
  stop(): Promise<void>;
}

/** Every test gets a server of its own, and fails on a request to another origin or a breach of the page's policy. */
export const test = base.extend<{ site: Site; provoked: string | undefined; guard: void }>({
  /** What a test does on purpose for the guard to notice; it must notice it. */
  provoked: [undefined, { option: true }],

  site: async ({}, use) => {
    const { server, address } = await serve(join(root, 'www/app/dist'), 4600);
    let running = true;
    const stop = async () => {
      if (!running) return;
      running = false;
      server.closeAllConnections();
      await new Promise((done) => server.close(done));
    };
    await use({ address, stop });
    await stop();
  },
  guard: [
    async ({ context, site, provoked }, use) => {
      const elsewhere: string[] = [];
      const breaches: string[] = [];
      context.on('request', (request) => {
        const url = new URL(request.url());
        if (url.protocol !== 'blob:' && url.protocol !== 'data:' && url.origin !== new URL(site.address).origin) elsewhere.push(request.url());
      });
      context.on('console', (message) => {
        if (/content security policy/i.test(message.text())) breaches.push(message.text());
      });
      context.on('weberror', (error) => breaches.push(`uncaught: ${error.error().message}`));
      await context.addInitScript(() => {
        addEventListener('securitypolicyviolation', (event) => {
          console.error(`Content Security Policy: ${event.violatedDirective} ${event.blockedURI} ${event.sourceFile}:${event.lineNumber}`);
        });
      });
      await use();
      expect(elsewhere, 'requests to another origin').toEqual([]);
      if (provoked !== undefined) {
        expect(breaches.filter((breach) => breach.includes(provoked)), 'the guard noticed').not.toEqual([]);
        return;
      }
      expect(breaches, 'breaches of the policy, and uncaught errors').toEqual([]);
    },
    { auto: true },
  ],
});

export { expect };

/** A line of the result. */
export interface Row {
  tray: string;
  probability: string;
  plausible: string;
  aside: string;
  /** Only where a spot check is about the result. */
  checked: string | undefined;
}

/** What the page shows, as a person would read it off. */
export class Bench {
  readonly page: Page;
  readonly address: string;

  constructor(page: Page, site: Site) {
    this.page = page;
    this.address = site.address;
  }

  /** Opens the empty page. Strips come only when a test asks for them, unless `strips`. */
  async open(strips = false): Promise<void> {
    if (!strips) await this.page.addInitScript(() => (localStorage['strips'] ??= 'off'));
    await this.page.goto(this.address);
    await expect(this.page.getByRole('button', { name: 'Try the demo pile' })).toBeVisible();
  }

  async loadDemo(): Promise<void> {
    await this.page.getByRole('button', { name: 'Try the demo pile' }).click();
    await this.allRead();
  }

  /** Gives files as a person does who presses the button. */
  async choose(files: string | string[] | { name: string; mimeType: string; buffer: Buffer }[], button = 'Choose photos'): Promise<void> {
    if (await this.page.getByRole('button', { name: 'Add photos' }).isVisible()) {
      await this.page.getByRole('button', { name: 'Add photos' }).click();
    }
    const chooser = this.page.waitForEvent('filechooser');
    await this.page.getByRole('button', { name: button }).click();
    await (await chooser).setFiles(files as string[]);
  }

  async allRead(): Promise<void> {
    await expect(this.page.getByRole('status').filter({ hasText: /photos? added|No new photo/ })).toHaveCount(1, { timeout: 150_000 });
    await expect(this.page.locator('ken-reading progress')).toHaveCount(0);
  }

  get picture() {
    return this.page.locator('ken-question .mat img');
  }

  async inHand(): Promise<string> {
    return (await this.picture.getAttribute('alt')) ?? '';
  }

  /** Waits until another item is in hand. */
  async nextAfter(item: string): Promise<void> {
    // Looked at in one go: after the last question there is no picture to wait for.
    const shown = () => this.picture.evaluateAll((all) => all.map((one) => one.getAttribute('alt')));
    await expect(async () => expect((await shown())[0]).not.toBe(item)).toPass({
      intervals: [5, 10, 20],
      timeout: 15_000,
    });
  }

  async trays(): Promise<string[]> {
    return this.page.locator('ken-question .rows .label').allTextContents();
  }

  /** Answers for the item in hand by keyboard alone. `null`: none of these. */
  async answer(tray: string | null): Promise<void> {
    const item = await this.inHand();
    const { keyboard } = this.page;
    const place = (await this.trays()).indexOf(tray ?? '');
    if (tray === null) {
      await keyboard.press('n');
    } else if (place >= 0 && place < 10) {
      await keyboard.press(String((place + 1) % 10));
    } else {
      await keyboard.press('t');
      await keyboard.type(tray);
      await keyboard.press('Enter');
    }
    await this.nextAfter(item);
  }

  shelf(name: string) {
    return this.page.getByRole('region', { name, exact: true });
  }

  /** The result as the page hands it over. */
  async result(): Promise<Map<string, Row>> {
    const download = this.page.waitForEvent('download');
    await this.page.getByRole('button', { name: 'Take result' }).click();
    const rows = parseCsv(await textOf(await download));
    expect(rows[0]?.slice(0, 5)).toEqual(['item', 'tray', 'probability', 'plausible', 'set aside']);
    const named = ([item = '', tray = '', probability = '', plausible = '', aside = '', checked]: string[]) => [item, { tray, probability, plausible, aside, checked }] as const;
    return new Map(rows.slice(1).map(named));
  }
}

export async function textOf(download: Download): Promise<string> {
  return readFileSync(await download.path(), 'utf8');
}

/** RFC 4180, written apart from the page's writer so that the two check each other. */
export function parseCsv(text: string): string[][] {
  const rows: string[][] = [];
  let row: string[] = [];
  const cell = /("(?:[^"]|"")*"|[^,\r\n]*)(,|\r\n|$)/gy;
  while (cell.lastIndex < text.length) {
    const match = cell.exec(text);
    if (!match) throw new Error(`not RFC 4180 at ${cell.lastIndex}`);
    const [, raw = '', end] = match;
    row.push(raw.startsWith('"') ? raw.slice(1, -1).replaceAll('""', '"') : raw);
    if (end !== ',') {
      rows.push(row);
      row = [];
    }
  }
  return rows;
}
