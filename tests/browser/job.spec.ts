import { Bench, demo, expect, test } from './fixtures';

const ANSWERS_PER_TRAY = 3;
const LEAST_SHARE = 0.9;

test('the whole job on the demo pile, with the network cut', async ({ page, context, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  await bench.loadDemo();

  await context.setOffline(true);
  await site.stop();
  await page.reload();
  await expect(bench.picture).toBeVisible();

  const truth = new Map(demo.map(({ file, tray }) => [file, tray]));
  const categories = new Set(demo.map(({ tray }) => tray).filter((tray) => tray !== null));
  const answered = new Set<string>();
  let strays = 0;
  while (answered.size < ANSWERS_PER_TRAY * categories.size) {
    const item = await bench.inHand();
    const tray = truth.get(item);
    expect(tray, `${item} is in the demo’s index`).not.toBeUndefined();
    await bench.answer(tray ?? null);
    if (tray) answered.add(item);
    else strays++;
  }

  const result = await bench.result();
  expect(result.size).toBe(demo.length);
  const shown = demo.filter(({ tray }) => tray !== null);
  const right = shown.filter(({ file, tray }) => result.get(file)?.tray === tray);
  const open = shown.filter(({ file }) => !answered.has(file));
  const openRight = open.filter(({ file, tray }) => result.get(file)?.tray === tray);
  const share = right.length / shown.length;
  const percent = (part: number, of: number) => `${((100 * part) / of).toFixed(1)} %`;
  console.log(
    `  demo pile: ${categories.size} trays, ${answered.size} answers and ${strays} strays set aside; ` +
      `${percent(right.length, shown.length)} of ${shown.length} in the right tray, ` +
      `${percent(openRight.length, open.length)} of the ${open.length} never asked about`,
  );
  const times = await page.evaluate(() => performance.getEntriesByName('answer to sorted pile').map(({ duration }) => duration));
  times.sort((a, b) => a - b);
  console.log(
    `  from key to sorted pile: median ${times[Math.floor(times.length / 2)]?.toFixed(0)} ms, slowest ${times.at(-1)?.toFixed(0)} ms of ${times.length}`,
  );
  expect(share).toBeGreaterThanOrEqual(LEAST_SHARE);

  await page.reload();
  await expect(bench.picture).toBeVisible();
  expect(await bench.result(), 'the same after a reload').toEqual(result);

  await page.keyboard.press('u');
  await expect(page.getByText(/Undone: an answer/).first()).toBeVisible();
  await expect(page.getByRole('button', { name: 'Redo' })).toBeEnabled();
  await page.keyboard.press('Shift+U');
  await expect(page.getByText(/Done again: an answer/).first()).toBeVisible();
  expect(await bench.result(), 'the same after undo and redo').toEqual(result);
});

test('the demo pile opens again without a network', async ({ page, context, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  // The first load may have begun before the service worker took over.
  await page.reload();
  await bench.loadDemo();
  await page.getByRole('button', { name: 'Start over' }).click();
  await page.getByRole('button', { name: 'Delete the pile' }).click();
  await context.setOffline(true);
  await site.stop();
  await page.reload();
  await bench.loadDemo();
  await expect(page.getByText(`${demo.length} photos`, { exact: true })).toBeVisible();
});
