import { join } from 'node:path';
import { Bench, demo, demoFile, demoFolder, expect, test } from './fixtures';

const some = (from: number, to: number) => demo.slice(from, to).map(({ file }) => join(demoFolder, file));

test('a closed tab keeps what was read so far, and the rest can be added later', async ({ page, context, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose(some(0, 150));
  await expect(page.getByText(/Reading photos: (?:[5-9]|\d\d+) of 150/)).toBeVisible();
  await page.close();

  const again = await context.newPage();
  const reopened = new Bench(again, site);
  await again.goto(site.address);
  await expect(reopened.picture).toBeVisible();
  const kept = await reopened.result();
  expect(kept.size).toBeGreaterThanOrEqual(4);
  expect(kept.size).toBeLessThan(150);

  await reopened.choose(some(0, 150));
  await reopened.allRead();
  expect((await reopened.result()).size).toBe(150);
  await expect(again.getByText(`${kept.size} files were in the pile already and added only once`)).toBeVisible();
});

test('reading can be stopped and gone on with, and answers are possible meanwhile', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose(some(0, 200));
  await expect(page.getByText(/Reading photos: \d+ of 200/)).toBeVisible();
  await expect(bench.picture).toBeVisible();
  await bench.answer('First');
  await page.getByRole('button', { name: 'Stop' }).click();
  await expect(page.getByText(/Stopped after \d+ of 200/)).toBeVisible();
  await page.getByRole('button', { name: 'Read the rest' }).click();
  await bench.allRead();
  expect((await bench.result()).size).toBe(200);
  await expect(bench.shelf('First')).toBeVisible();
});

test('a second tab is told, and harms nothing', async ({ page, context, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose(some(0, 3));
  await bench.allRead();
  const second = await context.newPage();
  await second.goto(site.address);
  await expect(second.getByText(/open in another tab/)).toBeVisible();
  await second.close();
  await page.reload();
  await expect(bench.picture).toBeVisible();
});

test('a full device is said, not hidden, and nothing is lost when there is room again', async ({ page, context, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  const devtools = await context.newCDPSession(page);
  const origin = new URL(site.address).origin;
  await devtools.send('Storage.overrideQuotaForOrigin', { origin, quotaSize: 1000 });
  await bench.choose(some(0, 6));
  await bench.allRead();
  await bench.answer('First');
  await expect(page.getByText(/no room left/)).toBeVisible();
  await devtools.send('Storage.overrideQuotaForOrigin', { origin });
  await bench.answer('Second');
  await expect(page.getByText(/no room left/)).toBeHidden();
  const result = await bench.result();
  await page.reload();
  await expect(bench.picture).toBeVisible();
  expect(await bench.result()).toEqual(result);
});

test('starting over names what is lost and leaves nothing behind', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose([demoFile(0), demoFile(1)]);
  await bench.allRead();
  await bench.answer('First');
  await page.getByRole('button', { name: 'Start over' }).click();
  await expect(page.getByText('This deletes 2 photos, 1 tray and 1 answer')).toBeVisible();
  await page.getByRole('button', { name: 'Keep it' }).click();
  await expect(bench.picture).toBeVisible();
  await page.getByRole('button', { name: 'Start over' }).click();
  await page.getByRole('button', { name: 'Delete the pile' }).click();
  await expect(page.getByRole('button', { name: 'Try the demo pile' })).toBeVisible();
  await page.reload();
  await expect(page.getByRole('button', { name: 'Try the demo pile' })).toBeVisible();
  await bench.choose([demoFile(0)]);
  await bench.allRead();
  expect((await bench.result()).size).toBe(1);
});
