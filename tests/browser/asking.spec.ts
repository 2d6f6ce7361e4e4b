import AxeBuilder from '@axe-core/playwright';
import type { Page } from '@playwright/test';
import { Bench, demo, demoFile, expect, test } from './fixtures';

/** Enough for strips, and soon read. */
const PHOTOS = 70;

const truth = new Map(demo.map(({ file, tray }) => [file, tray]));

async function load(bench: Bench): Promise<void> {
  await bench.choose(Array.from({ length: PHOTOS }, (_, index) => demoFile(index)));
  await bench.allRead();
}

/** Answers by the demo's index until every tray has this many. */
async function answerRound(bench: Bench, answers: number): Promise<void> {
  for (let given = 0; given < answers; given++) {
    await bench.answer(truth.get(await bench.inHand()) ?? null);
  }
}

function strip(page: Page) {
  return page.locator('ken-strip');
}

/** A strip acts only once somebody can have looked at it. */
async function stripReady(page: Page): Promise<{ tray: string; names: string[] }> {
  await expect(page.locator('ken-strip[aria-busy=false]')).toBeVisible();
  const heading = await page.getByRole('heading', { name: /^All in / }).textContent();
  const names = await strip(page).getByRole('button').evaluateAll((all) => all.map((one) => (one as HTMLElement).title));
  return { tray: heading?.replace(/^All in (.*)\?$/, '$1') ?? '', names };
}

async function answered(page: Page): Promise<number> {
  const text = (await page.locator('ken-band').getByText(/by you$/).textContent()) ?? '0';
  return Number.parseInt(text.replace(/\D/g, ''), 10);
}

test('a strip: taken out, confirmed with one key, undone as one', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await load(bench);
  await answerRound(bench, 16);
  const before = await answered(page);
  const question = await bench.inHand();

  await page.keyboard.press('s');
  const { tray, names } = await stripReady(page);
  expect(names.length).toBeGreaterThanOrEqual(4);
  const axe = await new AxeBuilder({ page }).include('ken-bench').analyze();
  expect(axe.violations.map(({ id, nodes }) => `${id}: ${nodes[0]?.html}`)).toEqual([]);

  // The arrows lead into the strip; Space takes out, and back in again.
  await page.keyboard.press('ArrowRight');
  await page.keyboard.press('ArrowRight');
  const second = strip(page).getByRole('button').nth(1);
  await expect(second).toBeFocused();
  await page.keyboard.press(' ');
  await expect(second).toHaveAttribute('aria-pressed', 'true');
  await page.keyboard.press(' ');
  await expect(second).toHaveAttribute('aria-pressed', 'false');
  await page.keyboard.press(' ');

  await page.keyboard.press('Enter');
  // Exactly what stayed is answered, and what was taken out is asked about.
  await expect.poll(() => bench.inHand()).toBe(names[1]);
  expect(await answered(page)).toBe(before + names.length - 1);
  await expect(page.locator('.said')).toContainText(`${names.length - 1} photos placed in ${tray}.`);

  await page.keyboard.press('u');
  const again = await stripReady(page);
  expect(again.tray).toBe(tray);
  expect(new Set(again.names)).toEqual(new Set(names.filter((name) => name !== names[1])));
  expect(await answered(page), 'one step back').toBe(before);

  await page.keyboard.press('Shift+U');
  await expect.poll(() => answered(page)).toBe(before + names.length - 1);
  await page.keyboard.press('u');
  await stripReady(page);

  // One at a time: the question from before, and no more strips until they are wanted.
  await page.keyboard.press('s');
  await expect(strip(page)).toHaveCount(0);
  await expect.poll(() => bench.inHand()).toBe(question);
  await page.reload();
  await expect(bench.picture).toBeVisible();
  await expect(strip(page)).toHaveCount(0);
});

test('a strip: another tray, none of these and can’t tell for one of it, and by touch', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await load(bench);
  await answerRound(bench, 16);
  const before = await answered(page);
  await page.getByRole('button', { name: /look-alikes at once/ }).click();
  const { tray, names } = await stripReady(page);

  // Without an item of the strip they say how to lead to one.
  await page.keyboard.press('n');
  await expect(page.locator('.said')).toContainText('First lead to one of the strip');

  await page.keyboard.press('ArrowRight');
  await page.keyboard.press('n');
  await expect(strip(page).getByRole('button')).toHaveCount(names.length - 1);
  await expect(bench.shelf('Set aside').getByRole('button', { name: names[0] })).toBeVisible();
  await expect(strip(page).getByRole('button').first()).toBeFocused();
  await page.keyboard.press('c');
  await expect(strip(page).getByRole('button')).toHaveCount(names.length - 2);
  expect(await strip(page).getByRole('button').first().getAttribute('title'), 'what stays, stays in its place').toBe(names[2]);

  // Pointing takes out as well.
  await strip(page).getByRole('button').first().click();
  await expect(strip(page).getByRole('button').first()).toHaveAttribute('aria-pressed', 'true');

  const trays = await bench.trays();
  const other = trays.findIndex((name) => name !== tray);
  await page.keyboard.press(String((other + 1) % 10));
  await expect.poll(() => bench.inHand()).toBe(names[2]);
  expect(await answered(page)).toBe(before + names.length - 3);
  await expect(page.locator('.said')).toContainText(`placed in ${trays[other]}.`);
});

test('a strip can go into a new tray, as one step', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await load(bench);
  await answerRound(bench, 16);
  const trays = await bench.trays();
  await page.keyboard.press('s');
  await stripReady(page);
  await page.keyboard.press('t');
  await page.keyboard.type('Odd ones');
  await page.keyboard.press('Enter');
  await expect(page.locator('.said')).toContainText('placed in Odd ones.');
  expect(await bench.trays()).toEqual([...trays, 'Odd ones']);
  await page.keyboard.press('u');
  await expect.poll(() => bench.trays()).toEqual(trays);
});

test('the outlook says what the core says, and only after a while aloud', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await load(bench);
  const line = page.locator('ken-outlook p');
  await expect(line).toHaveText(/too little to tell yet/);
  await answerRound(bench, 12);
  const outlook = () =>
    page.evaluate(() => {
      const app = document.querySelector('ken-bench') as unknown as { desk: { snapshot: { outlook: Record<'now' | 'afterTenMore', Record<'low' | 'expected' | 'high', number>> } } };
      return app.desk.snapshot.outlook;
    });
  const { now, afterTenMore } = await outlook();
  const round = (share: number) => Math.round(100 * share);
  const shown = ((await line.textContent()) ?? '').match(/\d+/g)?.map(Number);
  expect(shown).toEqual([round(now.expected), round(now.low), round(now.high), round(afterTenMore.expected)]);
  await expect(page.locator('ken-outlook [aria-live=polite]')).toHaveText(new RegExp(`about ${round(now.expected)}`));
});

test('the answers beside random order: offered with the result, worked out in a panel, with its figures', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await load(bench);
  await page.getByRole('button', { name: 'Compare with random order' }).click();
  await expect(page.getByRole('dialog')).toContainText('too little to tell yet');
  await page.keyboard.press('Escape');
  await answerRound(bench, 12);
  await expect(page.locator('.offer')).toHaveCount(0);
  await bench.result();
  await page.locator('.offer').getByRole('button', { name: 'Compare with random order' }).click();
  const panel = page.getByRole('dialog');
  await expect(panel.getByText(/^You gave 12 answers\. In random order it would have been (about|more than) \d/)).toBeVisible({ timeout: 90_000 });
  await expect(panel.getByRole('progressbar')).toHaveCount(0);
  await panel.getByText('The figures').click();
  const last = await panel.getByRole('row').filter({ has: page.getByRole('rowheader', { name: '12', exact: true }) }).getByRole('cell').first().textContent();
  const shown = await page.locator('ken-outlook strong').textContent();
  expect(`about ${last}`, 'the last of the person’s points is the outlook').toBe(shown);
  const { violations } = await new AxeBuilder({ page }).analyze();
  expect(violations.map(({ id, nodes }) => `${id}: ${nodes[0]?.html}`)).toEqual([]);
});
