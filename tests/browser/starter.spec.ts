import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import AxeBuilder from '@axe-core/playwright';
import type { Page } from '@playwright/test';
import { core } from '../native.mjs';
import { Bench, demo, type DemoItem, demoFolder, expect, type Site, test } from './fixtures';

const files = (items: readonly DemoItem[]) => items.map(({ file }) => join(demoFolder, file));
const truth = new Map(demo.map(({ file, tray }) => [file, tray]));
const trays = [...new Set(demo.flatMap(({ tray }) => tray ?? []))];

/** The first `each` demo pictures of some trays, after the first `skip`. */
function pictures(of: readonly string[], each: number, skip = 0): DemoItem[] {
  return of.flatMap((tray) => demo.filter((item) => item.tray === tray).slice(skip, skip + each));
}

class PastBench extends Bench {
  constructor(page: Page, site: Site) {
    super(page, site);
  }

  async readAndAnswer(items: readonly DemoItem[], answers: number): Promise<void> {
    await this.choose(files(items));
    await this.allRead();
    for (let given = 0; given < answers; given++) await this.answer(truth.get(await this.inHand()) ?? null);
  }

  get line() {
    return this.page.locator('ken-starter-line');
  }

  get panel() {
    return this.page.getByRole('dialog', { name: 'What past piles taught' });
  }

  async learn(): Promise<void> {
    await this.page.getByRole('button', { name: 'Learn from this pile' }).click();
    await expect(this.page.locator('progress')).toHaveCount(0, { timeout: 400_000 });
  }

  async startOver(): Promise<void> {
    await this.page.getByRole('button', { name: 'Start over' }).click();
    await this.page.getByRole('button', { name: 'Delete the pile' }).click();
    await expect(this.page.getByRole('button', { name: 'Try the demo pile' })).toBeVisible();
  }

  async openPast(): Promise<void> {
    await this.page.getByRole('button', { name: 'Past piles' }).last().click();
    await expect(this.panel).toBeVisible();
  }

  async openStarter(name: string, buffer: Buffer): Promise<void> {
    const chooser = this.page.waitForEvent('filechooser');
    await this.page.getByRole('button', { name: 'Open a starter file' }).click();
    await (await chooser).setFiles({ name, mimeType: 'application/octet-stream', buffer });
  }
}

test('a pile teaches the next one, with the network cut', async ({ page, context, site }) => {
  test.setTimeout(900_000);
  const bench = new PastBench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  await page.reload();
  await expect(page.getByRole('button', { name: 'Try the demo pile' })).toBeVisible();
  await bench.choose(files(pictures(trays.slice(0, 1), 1)));
  await bench.allRead();
  await bench.startOver();
  await context.setOffline(true);
  await site.stop();

  await bench.readAndAnswer(pictures(trays, 5), 18);
  await expect(bench.line, 'nothing to say yet').toBeEmpty();
  await bench.result();
  await expect(bench.line).toContainText('This one can teach it');

  // Learning leaves the page free: a clock that ticks on its main thread never stands still for a large part of it.
  await page.evaluate(() => {
    const clock = { last: performance.now(), longest: 0 };
    Object.assign(window, { clock });
    setInterval(() => {
      clock.longest = Math.max(clock.longest, performance.now() - clock.last);
      clock.last = performance.now();
    }, 10);
  });
  const worker = page.waitForEvent('worker', (one) => one.url().includes('learn-worker'));
  const began = Date.now();
  await bench.learn();
  const took = Date.now() - began;
  await worker;
  const longest = await page.evaluate(() => (window as unknown as { clock: { longest: number } }).clock.longest);
  console.log(`  learned in ${(took / 1000).toFixed(1)} s; the page stood still for at most ${longest.toFixed(0)} ms of it`);
  expect(longest).toBeLessThan(took / 3);
  await expect(page.getByText(/Learned from \d+ answers in 8 trays/).first()).toBeVisible();

  await bench.startOver();
  await expect(bench.line).toContainText('The next pile of photos starts from what past piles taught: 8 trays.');
  await bench.readAndAnswer(pictures(trays, 3, 5), 10);
  await expect(bench.line).toContainText('Starts from what past piles taught: 8 trays.');

  // Off and on again: other figures, then the same; all answers stay.
  const taught = await bench.result();
  await page.getByRole('button', { name: 'Past piles' }).last().click();
  await bench.panel.getByRole('button', { name: 'Switch off' }).click();
  await expect(bench.panel).toContainText('switched off for this pile');
  await page.keyboard.press('Escape');
  const untaught = await bench.result();
  expect(untaught).not.toEqual(taught);
  const answered = (result: typeof taught) => [...result].filter(([, { probability }]) => probability === '1.0000').map(([item, { tray }]) => [item, tray]);
  expect(answered(untaught)).toEqual(answered(taught));
  await page.reload();
  await expect(bench.picture).toBeVisible();
  expect(await bench.result(), 'off after a reload').toEqual(untaught);
  await page.keyboard.press('p');
  await bench.panel.getByRole('button', { name: 'Switch on' }).click();
  await expect(bench.panel).toContainText('Starts from what past piles taught: 8 trays.');
  await page.keyboard.press('Escape');
  expect(await bench.result()).toEqual(taught);
  await page.reload();
  await expect(bench.picture).toBeVisible();
  expect(await bench.result(), 'on after a reload').toEqual(taught);

  // As a file, away with everything, and back from the file.
  await bench.openPast();
  const download = page.waitForEvent('download');
  await bench.panel.getByRole('button', { name: 'Save as a file' }).click();
  const file = readFileSync(await (await download).path());
  expect(file.length).toBeLessThan(400_000);
  await expect(bench.panel.getByRole('status')).toContainText('Saved as past-piles.starter');
  await bench.panel.getByRole('button', { name: 'Forget all' }).click();
  await bench.panel.getByRole('button', { name: 'Forget for good?' }).click();
  await expect(bench.panel).toContainText('Nothing is kept yet.');
  await bench.openStarter('finds.starter', file);
  await expect(bench.panel.getByRole('status')).toContainText('finds.starter is kept: 8 trays.');
  await expect(bench.panel.getByRole('radio', { name: /finds\.starter/ })).toBeChecked();
  await page.keyboard.press('Escape');
  await page.reload();
  await expect(bench.picture).toBeVisible();
  expect(await bench.result(), 'the pile keeps its own copy').toEqual(taught);
});

test('few trays teach here but are not given away; learning can be stopped; what is kept can be forgotten', async ({ page, site }) => {
  test.setTimeout(900_000);
  const bench = new PastBench(page, site);
  await bench.open();
  await bench.readAndAnswer(pictures(trays.slice(0, 3), 4), 1);
  await page.keyboard.press('p');
  await expect(bench.panel).toContainText('Too little to learn from yet');
  await expect(bench.panel.getByRole('button', { name: 'Learn from this pile' })).toHaveCount(0);
  await page.keyboard.press('Escape');
  for (let given = 0; given < 8; given++) await bench.answer(truth.get(await bench.inHand()) ?? null);

  await page.keyboard.press('p');
  await bench.panel.getByRole('button', { name: 'Learn from this pile' }).click();
  await bench.panel.getByRole('button', { name: 'Stop' }).click();
  await expect(bench.panel).toContainText('Stopped. Nothing was learned');
  await expect(bench.panel).toContainText('Nothing is kept yet.');

  // From the question whether to start over.
  await page.keyboard.press('Escape');
  await page.getByRole('button', { name: 'Start over' }).click();
  await bench.learn();
  await expect(bench.panel.getByRole('status')).toContainText('Learned from 9 answers in 3 trays');
  await bench.panel.getByRole('button', { name: 'Save as a file' }).click();
  await expect(bench.panel.getByRole('alert')).toContainText('comes from 3 trays, and less than 8 are not saved as a file');
  await expect(bench.panel.getByRole('button', { name: /too$/ }), 'not for the pile that taught it').toHaveCount(0);

  for (const colorScheme of ['light', 'dark'] as const) {
    for (const viewport of [{ width: 390, height: 844 }, { width: 1280, height: 800 }]) {
      await page.emulateMedia({ colorScheme, reducedMotion: 'reduce' });
      await page.setViewportSize(viewport);
      await page.waitForTimeout(400);
      const { violations } = await new AxeBuilder({ page }).withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice']).analyze();
      expect(violations.map(({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join('\n')}`)).toEqual([]);
    }
  }

  // By keyboard: the next pile from nothing.
  await bench.panel.getByRole('radio', { name: /Your past piles/ }).focus();
  await page.keyboard.press('ArrowDown');
  await expect(bench.panel.getByRole('radio', { name: 'Nothing' })).toBeChecked();
  await page.keyboard.press('Escape');
  await bench.startOver();
  await expect(bench.line).toBeEmpty();
  await bench.readAndAnswer(pictures(trays.slice(3, 5), 3), 2);
  await expect(bench.line).toBeEmpty();

  // Chosen for the next pile again, it can still be used for this one.
  await bench.openPast();
  await bench.panel.getByRole('radio', { name: /Your past piles/ }).click();
  await bench.panel.getByRole('button', { name: 'Start this pile from your past piles too' }).click();
  await expect(bench.panel).toContainText('Starts from what past piles taught: 3 trays.');
  await bench.panel.getByRole('button', { name: /^Forget the pile of/ }).click();
  await bench.panel.getByRole('button', { name: 'Forget for good?' }).click();
  await expect(bench.panel).toContainText('Nothing is kept yet.');
  await expect(bench.panel).toContainText('Nothing yet: no pile has taught');
});

test('files that are no starter for this page get one clear sentence', async ({ page, site }) => {
  const { PastPiles } = await core();
  const past = new PastPiles({ encoder: 'another', dimension: 4, nonNegative: false });
  const rows = Float32Array.from({ length: 9 * 3 * 4 }, (_, index) => Math.sin(index * index + 1));
  past.addPile(rows, Int32Array.from({ length: 27 }, (_, item) => item % 9));
  const other = Buffer.from(past.learn().bytes());

  const bench = new PastBench(page, site);
  await bench.open();
  await bench.openPast();
  const { panel } = bench;
  await bench.openStarter('other.starter', other);
  await expect(panel.getByRole('alert')).toContainText('other.starter was learned from other material than this page reads');
  await bench.openStarter('cut.starter', other.subarray(0, other.length / 2));
  await expect(panel.getByRole('alert')).toContainText('cut.starter is not a starter, or it is damaged.');
  await expect(panel).toContainText('Nothing yet: no pile has taught');

  // Dropped on the page, beside a photo, which goes into the pile.
  await page.keyboard.press('Escape');
  const photo = readFileSync(join(demoFolder, demo[0]?.file ?? ''));
  const transfer = await page.evaluateHandle(([picture, words]) => {
    const bytes = (text: string) => Uint8Array.from(atob(text), (character) => character.charCodeAt(0));
    const data = new DataTransfer();
    data.items.add(new File([bytes(picture ?? '')], 'photo.jpg', { type: 'image/jpeg' }));
    data.items.add(new File([bytes(words ?? '')], 'letter.starter'));
    return data;
  }, [photo.toString('base64'), Buffer.from('Dear Sir or Madam').toString('base64')]);
  await page.dispatchEvent('ken-bench', 'drop', { dataTransfer: transfer });
  await expect(panel.getByRole('alert')).toContainText('letter.starter is not a starter, or it is damaged.');
  await page.keyboard.press('Escape');
  await expect(bench.picture).toHaveAttribute('alt', 'photo.jpg');
});
