import { join } from 'node:path';
import AxeBuilder from '@axe-core/playwright';
import type { Page } from '@playwright/test';
import { Bench, demo, demoFolder, expect, test } from './fixtures';

async function clean(page: Page, state: string): Promise<void> {
  // Colours in the middle of a fade are not what anybody reads.
  await page.waitForTimeout(400);
  const { violations } = await new AxeBuilder({ page }).withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice']).analyze();
  const found = violations.map(({ id, nodes }) => `${id}: ${nodes.map((node) => `${node.html} ${node.failureSummary}`).join('\n')}`);
  expect(found, state).toEqual([]);
}

for (const colorScheme of ['light', 'dark'] as const) {
  for (const [size, viewport] of Object.entries({ phone: { width: 390, height: 844 }, desktop: { width: 1280, height: 800 } })) {
    test(`nothing for axe to find: ${colorScheme}, ${size}`, async ({ page, site }) => {
      await page.emulateMedia({ colorScheme, reducedMotion: 'reduce' });
      await page.setViewportSize(viewport);
      const bench = new Bench(page, site);
      await bench.open();
      await clean(page, 'empty page');
      const truth = new Map(demo.map(({ file, tray }) => [file, tray]));
      const chooser = page.waitForEvent('filechooser');
      await page.getByRole('button', { name: 'Choose photos' }).click();
      await (await chooser).setFiles([...demo.slice(0, 40).map(({ file }) => join(demoFolder, file)), join(demoFolder, 'index.json')]);
      await expect(page.getByRole('button', { name: 'Stop' })).toBeVisible();
      await clean(page, 'reading');
      await bench.allRead();
      await clean(page, 'unsorted pile, one file refused');
      for (let answers = 0; answers < 8; answers++) await bench.answer(truth.get(await bench.inHand()) ?? null);
      await clean(page, 'sorted pile');
      await page.keyboard.press('t');
      await page.keyboard.type('a');
      await clean(page, 'finding a tray');
      await page.keyboard.press('Escape');
      await page.keyboard.press('?');
      await clean(page, 'help');
      await page.keyboard.press('Escape');
      await page.getByRole('button', { name: /^Rename, merge or remove/ }).first().click();
      await clean(page, 'tray panel');
      await page.keyboard.press('Escape');
      await page.getByRole('button', { name: 'Start over' }).click();
      await clean(page, 'start over');
      await page.keyboard.press('Escape');
      expect(await page.evaluate(() => document.documentElement.scrollWidth <= innerWidth), 'no sideways scrolling').toBe(true);
    });
  }
}

test('the job with the keyboard alone', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  const { keyboard } = page;
  const focused = () =>
    page.evaluate(() => {
      let element = document.activeElement;
      while (element?.shadowRoot?.activeElement) element = element.shadowRoot.activeElement;
      return element?.getAttribute('aria-label') ?? element?.textContent?.trim() ?? '';
    });
  const tabTo = async (name: RegExp) => {
    for (let presses = 0; presses < 60; presses++) {
      await keyboard.press('Tab');
      if (name.test(await focused())) return;
    }
    throw new Error(`Tab never reached ${name}`);
  };
  await tabTo(/Try the demo pile/);
  await keyboard.press('Enter');
  await bench.allRead();
  const truth = new Map(demo.map(({ file, tray }) => [file, tray]));
  for (let answers = 0; answers < 10; answers++) await bench.answer(truth.get(await bench.inHand()) ?? null);

  // The guess by Enter, and what it did is said.
  const item = await bench.inHand();
  await keyboard.press('Enter');
  await bench.nextAfter(item);
  await expect(page.getByRole('status').filter({ hasText: /Placed in/ })).toHaveCount(1);

  // Out of turn: from the shelf into the hand.
  await tabTo(/% sure|your answer$/);
  const first = await focused();
  await keyboard.press('ArrowRight');
  expect(await focused()).not.toBe(first);
  const name = (await focused()).split(',')[0] ?? '';
  await keyboard.press('Enter');
  await expect(bench.picture).toHaveAttribute('alt', name);
  await keyboard.press('q');
  await expect(bench.picture).not.toHaveAttribute('alt', name);

  // With single keys off, letters and digits do nothing.
  await keyboard.press('?');
  await page.getByLabel(/Single keys/).focus();
  await keyboard.press('Space');
  await keyboard.press('Escape');
  const before = await bench.inHand();
  await keyboard.press('1');
  await keyboard.press('n');
  await page.waitForTimeout(300);
  expect(await bench.inHand()).toBe(before);
});
