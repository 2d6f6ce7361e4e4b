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
