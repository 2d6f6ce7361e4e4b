import { Bench, demo, demoFolder, expect, test } from './fixtures';
import { join } from 'node:path';

test.beforeEach(async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose(demo.slice(0, 12).map(({ file }) => join(demoFolder, file)));
  await bench.allRead();
  await bench.answer('First');
  await bench.answer('Second');
});

test('a tray can be renamed, merged and removed, and all of it undone', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await page.getByRole('button', { name: 'Rename, merge or remove First' }).click();
  await page.getByLabel('Name', { exact: true }).fill('Second');
  await page.getByRole('button', { name: 'Rename', exact: true }).click();
  await expect(page.getByRole('alert').filter({ hasText: 'Second' })).toBeVisible();
  await page.getByLabel('Name', { exact: true }).fill('Sherds');
  await page.getByRole('button', { name: 'Rename', exact: true }).click();
  await expect(bench.shelf('Sherds')).toBeVisible();

  await page.getByRole('button', { name: 'Rename, merge or remove Sherds' }).click();
  await page.getByLabel('Put everything into').selectOption('Second');
  await page.getByRole('button', { name: 'Merge', exact: true }).click();
  await expect(bench.shelf('Sherds')).toHaveCount(0);
  await page.keyboard.press('Control+z');
  await expect(bench.shelf('Sherds')).toBeVisible();

  await page.getByRole('button', { name: 'Rename, merge or remove Second' }).click();
  await page.getByRole('button', { name: 'Remove this tray' }).click();
  await expect(bench.shelf('Second')).toHaveCount(0);
  await page.keyboard.press('Control+z');
  await expect(bench.shelf('Second')).toBeVisible();
});

test('an item is corrected by dragging, by click and key, and by the keys alone', async ({ page, site }) => {
  const bench = new Bench(page, site);
  const answeredIn = (tray: string) => bench.shelf(tray).getByRole('button', { name: /your answer/ });
  await expect(answeredIn('First')).toHaveCount(1);
  await answeredIn('First').dragTo(bench.shelf('Second'));
  await expect(answeredIn('Second')).toHaveCount(2);
  await expect(answeredIn('First')).toHaveCount(0);

  await answeredIn('Second').first().click();
  await expect(page.getByText('You put it in Second')).toBeVisible();
  await page.keyboard.press('1');
  await expect(answeredIn('First')).toHaveCount(1);

  await answeredIn('First').focus();
  await page.keyboard.press('2');
  await expect(answeredIn('Second')).toHaveCount(2);
});

test('an item can be zoomed, taken out and brought back', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await page.keyboard.press('z');
  await expect(page.getByRole('dialog')).toBeVisible();
  await page.keyboard.press('Escape');
  await expect(page.getByRole('dialog')).toHaveCount(0);
  const tile = bench.shelf('First').getByRole('button', { name: /your answer/ });
  await tile.focus();
  await page.keyboard.press('Delete');
  await expect(page.getByText('11 photos', { exact: true })).toBeVisible();
  await page.keyboard.press('u');
  await expect(page.getByText('12 photos', { exact: true })).toBeVisible();
});

test('keys answer for the item in the frame, whatever was clicked or dragged before', async ({ page, site }) => {
  const bench = new Bench(page, site);
  const answeredIn = (tray: string) => bench.shelf(tray).getByRole('button', { name: /your answer/ });
  const tile = (item: string) => page.locator('ken-shelves').getByRole('button', { name: item });
  const mine = await answeredIn('First').getAttribute('title');
  const clicked = mine?.split(',')[0] ?? '';

  await tile(clicked).click();
  await expect(bench.picture).toHaveAttribute('alt', clicked);
  await page.keyboard.press('2');
  await bench.nextAfter(clicked);
  const second = await bench.inHand();
  await page.keyboard.press('1');
  await bench.nextAfter(second);
  await expect(tile(clicked)).toHaveAttribute('title', `${clicked}, Second, your answer`);
  await expect(tile(second)).toHaveAttribute('title', `${second}, First, your answer`);

  await tile(clicked).dragTo(bench.shelf('First'));
  await expect(tile(clicked)).toHaveAttribute('title', `${clicked}, First, your answer`);
  for (const [key, shelf] of [['2', 'Second'], ['n', 'Set aside']] as const) {
    const item = await bench.inHand();
    expect(item).not.toBe(clicked);
    await page.keyboard.press(key);
    await bench.nextAfter(item);
    await expect(tile(item)).toHaveAttribute('title', new RegExp(`^${item}, ${shelf}, `));
  }
  const skipped = await bench.inHand();
  await page.keyboard.press('c');
  await bench.nextAfter(skipped);
  const removed = await bench.inHand();
  await page.keyboard.press('Delete');
  await bench.nextAfter(removed);
  await expect(tile(removed)).toHaveCount(0);
  await expect(tile(clicked)).toHaveAttribute('title', `${clicked}, First, your answer`);

  // Brought to a tile by keys, they mean that tile, once.
  await page.keyboard.press('ArrowRight');
  await tile(clicked).focus();
  await page.keyboard.press('2');
  await expect(tile(clicked)).toHaveAttribute('title', `${clicked}, Second, your answer`);
  const last = await bench.inHand();
  await page.keyboard.press('1');
  await bench.nextAfter(last);
  await expect(tile(clicked)).toHaveAttribute('title', `${clicked}, Second, your answer`);
});

test('a key that is held down acts once', async ({ page, site }) => {
  const bench = new Bench(page, site);
  const { keyboard } = page;
  const item = await bench.inHand();
  // Playwright sends the second and every further one as a repetition.
  for (let times = 0; times < 5; times++) await keyboard.down('n');
  await keyboard.up('n');
  await bench.nextAfter(item);
  await expect(bench.shelf('Set aside').getByRole('button', { name: /set aside by you/ })).toHaveCount(1);
  for (const key of ['c', 'Delete', 'u', '1', 'Enter']) {
    const before = await bench.inHand();
    for (let times = 0; times < 5; times++) await keyboard.down(key);
    await keyboard.up(key);
    await bench.nextAfter(before);
    await page.waitForTimeout(200);
  }
  // Delete was undone; what is left: two trays' answers, one by number, one by the guess.
  await expect(page.getByText('12 photos', { exact: true })).toBeVisible();
  await expect(page.locator('ken-shelves').getByRole('button', { name: /your answer/ })).toHaveCount(4);
});

test('a photo taken out can be added again, and taken out it stays after a reload', async ({ page, site }) => {
  const bench = new Bench(page, site);
  const first = join(demoFolder, demo[0]?.file ?? '');
  const tile = page.locator('ken-shelves').getByRole('button', { name: demo[0]?.file ?? '' }).first();
  await tile.focus();
  await page.keyboard.press('Delete');
  await expect(page.getByText('11 photos', { exact: true })).toBeVisible();
  await page.keyboard.press('u');
  await expect(page.getByText('12 photos', { exact: true })).toBeVisible();
  await bench.choose([first]);
  await expect(page.getByText('1 file was in the pile already')).toBeVisible();
  await page.getByRole('button', { name: 'Dismiss' }).click();

  await tile.focus();
  await page.keyboard.press('Delete');
  await expect(page.getByText('11 photos', { exact: true })).toBeVisible();
  await page.reload();
  await expect(page.getByText('11 photos', { exact: true })).toBeVisible();
  await bench.choose([first]);
  await expect(page.getByText('12 photos', { exact: true })).toBeVisible();
});

test('the last photo taken out can be brought back', async ({ page, site }) => {
  const bench = new Bench(page, site);
  for (let left = 12; left > 2; left--) {
    const item = await bench.inHand();
    await page.keyboard.press('Delete');
    await bench.nextAfter(item);
  }
  // The two answered ones are never in question.
  await expect(page.getByText('Nothing left to ask')).toBeVisible();
  await bench.shelf('First').getByRole('button', { name: /your answer/ }).focus();
  await page.keyboard.press('Delete');
  await expect(page.getByText('1 photo', { exact: true })).toBeVisible();
  await bench.shelf('Second').getByRole('button', { name: /your answer/ }).focus();
  await page.keyboard.press('Delete');
  await expect(page.getByRole('button', { name: 'Try the demo pile' })).toBeVisible();
  await page.getByRole('button', { name: 'Undo' }).click();
  await expect(page.getByText('1 photo', { exact: true })).toBeVisible();
});

for (const viewport of [{ width: 1280, height: 800 }, { width: 1280, height: 600 }, { width: 390, height: 844 }]) {
  test(`with 19 trays everything stays within reach: ${viewport.width} × ${viewport.height}`, async ({ page, site }, info) => {
    const bench = new Bench(page, site);
    const { keyboard } = page;
    await bench.choose(demo.slice(12, 24).map(({ file }) => join(demoFolder, file)));
    await expect(page.getByText('24 photos', { exact: true })).toBeVisible();
    await page.setViewportSize(viewport);
    const names = ['A name as long as names can be, '.padEnd(120, 'and longer, '), ...Array.from({ length: 16 }, (_, n) => `Tray number ${n + 3}`)];
    for (const name of names) {
      const item = await bench.inHand();
      await keyboard.press('t');
      await keyboard.type(name.trim());
      await keyboard.press('Enter');
      await bench.nextAfter(item);
    }
    await expect(page.locator('ken-question .rows button')).toHaveCount(19);
    await page.screenshot({ path: info.outputPath('trays.png') });
    const boxOf = async (selector: string) => (await page.locator(selector).first().boundingBox()) ?? { x: 0, y: -1, width: 0, height: 0 };
    const field = await boxOf('ken-question .field');
    const ways = await boxOf('ken-question .ways');
    const said = await boxOf('.said');
    const rows = await boxOf('ken-question .rows');
    expect(rows.y + rows.height, 'trays above the field').toBeLessThanOrEqual(field.y + 6);
    expect(field.y + field.height, 'field above the buttons').toBeLessThanOrEqual(ways.y);
    expect(ways.y + ways.height, 'buttons above what is said').toBeLessThanOrEqual(said.y);
    expect(said.y + said.height).toBeLessThanOrEqual(viewport.height);
    await expect(page.getByRole('button', { name: 'Help' })).toBeInViewport();
    const last = await bench.inHand();
    await page.getByRole('button', { name: 'Tray number 18' }).first().click();
    await bench.nextAfter(last);
    await expect(bench.picture).toBeInViewport({ ratio: 0.5 });
  });
}

test('at 200 % zoom the next item comes into view after an answer', async ({ page, site }) => {
  await page.setViewportSize({ width: 640, height: 400 });
  const bench = new Bench(page, site);
  await expect(page.locator('ken-question kbd.hint').first()).toBeVisible();
  for (const act of [() => page.getByRole('button', { name: /^None of these/ }).click(), () => page.keyboard.press('1')]) {
    await page.evaluate(() => scrollTo(0, document.documentElement.scrollHeight));
    await expect(bench.picture).not.toBeInViewport({ ratio: 0.5 });
    const item = await bench.inHand();
    await act();
    await bench.nextAfter(item);
    await expect(bench.picture).toBeInViewport({ ratio: 0.5 });
  }
});
