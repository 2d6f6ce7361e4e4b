import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import AxeBuilder from '@axe-core/playwright';
import type { Locator, Page } from '@playwright/test';
import { Bench, demo, demoFolder, expect, root, type Site, test, textOf } from './fixtures';

type Core = typeof import('../../www/kit/wasm/kenspeckle.js');

/** The same core as in the page, called here on what the page has kept: the two must say the same. */
async function core(): Promise<Core> {
  const folder = join(root, 'www/kit/wasm');
  const module = (await import(pathToFileURL(join(folder, 'kenspeckle.js')).href)) as Core;
  await module.default({ module_or_path: readFileSync(join(folder, 'kenspeckle_bg.wasm')) });
  return module;
}

interface Kept {
  sorter: string;
  check: { check: string; date?: string } | undefined;
  names: string[];
  embeddings: number[];
}

/** The pile as it lies in the browser's store. */
async function kept(page: Page): Promise<Kept> {
  // What was done last is written right after it is shown.
  await page.waitForTimeout(600);
  return page.evaluate(async () => {
    const done = <T>(request: IDBRequest<T>) =>
      new Promise<T>((resolve, reject) => {
        request.onsuccess = () => resolve(request.result);
        request.onerror = () => reject(request.error);
      });
    for (const { name } of await indexedDB.databases()) {
      const database = await done(indexedDB.open(name ?? ''));
      try {
        if (!database.objectStoreNames.contains('items') || !database.objectStoreNames.contains('state')) continue;
        const from = database.transaction(['items', 'state']);
        const [items, state] = await Promise.all([done(from.objectStore('items').getAll()), done(from.objectStore('state').get('pile'))]);
        if (!state) continue;
        return {
          sorter: state.sorter as string,
          check: state.check,
          names: items.map(({ name: item }) => item as string),
          embeddings: items.flatMap(({ embedding }) => [...(embedding as Float32Array)]),
        };
      } finally {
        database.close();
      }
    }
    throw new Error('there is no pile in the store');
  });
}

const truth = new Map(demo.map(({ file, tray }) => [file, tray]));
const percent = (share: number) => `${Math.round(100 * share)}%`;

/** A pile of the demo's first photos with so many answers; those at the places in `wrong` name another tray on purpose. */
async function sorted(page: Page, site: Site, photos: number, answers: number, wrong: readonly number[] = []): Promise<{ bench: Bench; planted: string[] }> {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose(demo.slice(0, photos).map(({ file }) => join(demoFolder, file)));
  await bench.allRead();
  const planted: string[] = [];
  let given = 0;
  while (given < answers) {
    const item = await bench.inHand();
    const right = truth.get(item) ?? null;
    const others = (await bench.trays()).filter((tray) => tray !== right);
    const lie = right !== null && wrong.includes(given) ? others[given % others.length] : undefined;
    if (lie !== undefined) planted.push(item);
    await bench.answer(lie ?? right);
    if (right !== null) given++;
  }
  return { bench, planted };
}

const panel = (page: Page): Locator => page.getByRole('dialog', { name: 'How sure?' });
const sheet = (page: Page): Locator => page.getByRole('tabpanel');

async function open(page: Page, tab?: string): Promise<void> {
  await page.keyboard.press('h');
  await expect(panel(page)).toBeVisible();
  if (tab) await page.getByRole('tab', { name: new RegExp(`^${tab}`) }).click();
  await expect(sheet(page).getByText('Being reckoned')).toHaveCount(0);
}

test('what the panel shows is what the core says of the same answers', async ({ page, site }) => {
  const { planted } = await sorted(page, site, 110, 30, [16, 22]);
  expect(planted).toHaveLength(2);
  const { Sorter } = await core();
  const { sorter: state, names, embeddings } = await kept(page);
  const sorter = Sorter.restore(state, Float32Array.from(embeddings));
  const tray = (number: number) => sorter.trays().find((one) => one.tray === number)?.name ?? '';
  const assessment = sorter.assessment();
  if (!assessment || assessment.share.value === null || !assessment.calibration || !assessment.curve) throw new Error('nothing to compare');

  await open(page);
  const { share } = assessment;
  expect(share.judged).toBeGreaterThan(20);
  await expect(sheet(page).locator('.big strong')).toHaveText(percent(share.value ?? 0));
  await expect(sheet(page).locator('.big span')).toContainText(`${share.right} of ${share.judged} answers`);
  await expect(sheet(page).locator('.big span')).toContainText(`${percent(share.wilson.low)} to ${percent(share.wilson.high)}`);
  const rows = await sheet(page).locator('section:has(#overall) tbody tr').evaluateAll((all) => all.map((row) => [row.querySelector('th')?.textContent?.trim(), row.querySelector('.figures')?.textContent?.trim()]));
  expect(rows).toEqual(
    assessment.trays.map((one) => [
      tray(one.tray),
      one.share.value === null
        ? one.answers === 1 ? 'one answer: can’t be known yet' : 'not judged'
        : `${one.share.right} of ${one.share.judged}: ${percent(one.share.wilson.low)} to ${percent(one.share.wilson.high)}`,
    ]),
  );
  // The bar is as long as the share, its line as long as the interval.
  expect(Number(await sheet(page).locator('section:has(#overall) > svg .bar').getAttribute('width'))).toBeCloseTo(100 * (share.value ?? 0), 6);
  expect(await sheet(page).locator('section:has(#overall) > svg .whisker').getAttribute('d')).toContain(`M ${100 * share.wilson.low} 10 H ${100 * share.wilson.high} `);

  const pairs = await sheet(page).locator('.pairs li').evaluateAll((all) =>
    all.map((one) => [one.querySelector('p')?.textContent?.trim(), [...one.querySelectorAll('.tile img')].map((image) => image.getAttribute('alt'))]),
  );
  expect(pairs).toEqual(
    assessment.confusions.map(({ tray: named, takenFor, items }) => [
      `${items.length} of ${tray(named)} taken for ${tray(takenFor)}`,
      items.slice(0, 6).map((item) => names[item]),
    ]),
  );

  const numbers = (title: string) =>
    sheet(page).locator(`section:has(#${title}) table tbody tr`).evaluateAll((all) => all.map((row) => [...row.children].map((cell) => cell.textContent?.trim())));
  expect(await numbers('calibration')).toEqual(
    assessment.calibration.bins.map(({ said, items, right, wilson }) => [percent(said), String(items), percent(right), `${percent(wilson.low)} to ${percent(wilson.high)}`]),
  );
  await expect(sheet(page).getByText(`They are off by ${percent(assessment.calibration.error)} on average.`)).toBeVisible();
  expect(await numbers('ahead')).toEqual(
    assessment.curve.ahead.map(({ more, low, likely, high }) => [more === 0 ? 'now' : `+${Math.round(more)}`, percent(likely), `${percent(low)} to ${percent(high)}`]),
  );
  for (const target of [0.95, 0.8]) {
    await page.getByLabel('Sorted right, as much as').selectOption(String(target));
    const projection = sorter.moreAnswers(target);
    const said = sheet(page).locator('section:has(#ahead) p').first();
    if (projection?.likely) await expect(said).toContainText(`About ${projection.likely.toLocaleString('en')} more answers to reach ${percent(target)}: at least ${projection.low.toLocaleString('en')}`);
    else await expect(said).toContainText(percent(target));
  }

  await page.getByRole('tab', { name: /^Doubts/ }).click();
  const doubts = sorter.doubts();
  const raised = await sheet(page).locator('.doubts .doubted img').evaluateAll((all) => all.map((image) => image.getAttribute('alt')));
  expect(raised).toEqual(doubts.map(({ item }) => names[item]));
  for (const item of planted) expect(raised, 'planted wrong answers are doubted').toContain(item);

  // What is plausible and set aside stands in the result, as the core has it.
  await page.keyboard.press('Escape');
  const result = await new Bench(page, site).result();
  const reasons = ['', 'unlike anything shown', 'between trays', 'too little to judge by'];
  const { setAside, status } = sorter.verdicts();
  for (const [number, name] of names.entries()) {
    const row = result.get(name);
    const open_ = status[number] === 0;
    expect(row?.aside, name).toBe(status[number] === 2 ? 'none of these' : reasons[setAside[number] ?? 0]);
    if (open_) expect(row?.plausible, name).toBe([...sorter.plausible(number)].map(tray).join('; '));
    if (setAside[number]) expect(row?.tray, name).toBe('');
  }
  const aside = [...setAside].filter((reason) => reason > 0).length;
  const shown = page.getByRole('region', { name: 'Set aside', exact: true }).getByRole('button', { name: /unlike anything shown|between trays|too little/ });
  if (aside > 0) await expect(shown.first()).toBeVisible();
  else await expect(shown).toHaveCount(0);
  sorter.free();
});

test('the person chooses how careful it is, and the choice is kept', async ({ page, site }) => {
  const { bench } = await sorted(page, site, 110, 34);
  const asideNow = async () => [...(await bench.result()).values()].filter(({ aside }) => aside !== '' && aside !== 'none of these').length;
  await open(page);
  await expect(page.getByLabel('How many known items may be set aside')).toHaveValue('0.05');
  await expect(page.getByLabel('Confidence of plausible trays')).toHaveValue('0.9');
  await page.getByLabel('How many known items may be set aside').selectOption('0');
  await expect(panel(page).getByRole('status').filter({ hasText: 'sorted anew' })).toBeVisible();
  await page.keyboard.press('Escape');
  await expect.poll(asideNow).toBe(0);
  await open(page);
  await page.getByLabel('How many known items may be set aside').selectOption('0.2');
  await page.getByLabel('Confidence of plausible trays').selectOption('0.99');
  await page.keyboard.press('Escape');
  await expect.poll(asideNow).toBeGreaterThan(0);
  const some = await asideNow();
  await open(page);
  await page.getByLabel(/Sort only what has exactly one/).check();
  await page.keyboard.press('Escape');
  await expect.poll(asideNow).toBeGreaterThan(some);
  // What is sorted then has exactly one plausible tray: the one it is in.
  for (const { tray, plausible } of (await bench.result()).values()) if (tray !== '') expect(plausible).toBe(tray);

  await page.reload();
  await expect(bench.picture).toBeVisible();
  await open(page);
  await expect(page.getByLabel('How many known items may be set aside')).toHaveValue('0.2');
  await expect(page.getByLabel('Confidence of plausible trays')).toHaveValue('0.99');
  await expect(page.getByLabel(/Sort only what has exactly one/)).toBeChecked();
});

test('an item that is set aside says why, in hand and on the shelf, and several plausible trays are marked', async ({ page, site }) => {
  const { bench } = await sorted(page, site, 110, 34);
  await open(page);
  await page.getByLabel('How many known items may be set aside').selectOption('0.2');
  await page.getByLabel('Confidence of plausible trays').selectOption('0.99');
  await expect(panel(page).getByRole('status').filter({ hasText: 'sorted anew' })).toBeVisible();
  await page.keyboard.press('Escape');
  const aside = page.locator('ken-shelves').getByRole('button', { name: /, Set aside, unlike anything shown/ });
  await expect(aside.first()).toBeVisible();
  const result = await bench.result();
  const one = [...result].find(([, { aside }]) => aside === 'unlike anything shown')?.[0] ?? '';
  const tile = page.locator('ken-shelves').getByRole('button', { name: `${one}, Set aside, unlike anything shown` });
  await tile.click();
  await expect(page.locator('ken-question').getByText('Set aside by the sorter: unlike anything shown.')).toBeVisible();

  const [several, row] = [...result].find(([, { plausible, tray }]) => tray !== '' && plausible.split('; ').length > 2) ?? ['', undefined];
  const others = row?.plausible.split('; ').filter((tray) => tray !== row.tray) ?? [];
  const sure = page.locator('ken-shelves').getByRole('button', { name: new RegExp(`^${several}, .*; ${others.join(', ')} plausible too`) });
  await sure.click();
  await expect(bench.picture).toHaveAttribute('alt', several);
  const marked = page.locator('ken-question .plausible .label');
  expect((await marked.allTextContents()).sort()).toEqual([...others].sort());
});

test('doubts: one key moves or leaves, and what was looked at is not raised again', async ({ page, site }) => {
  const { bench, planted } = await sorted(page, site, 110, 30, [16, 22]);
  await open(page, 'Doubts');
  const list = sheet(page).locator('.doubts > li');
  const names = () => list.locator('.doubted img').evaluateAll((all) => all.map((image) => image.getAttribute('alt') ?? ''));
  const before = await names();
  const first = before[0] ?? '';
  const rather = (await list.first().locator('.move').textContent())?.replace(/^\s*Move to /, '').replace(/\s*M\s*$/, '').trim() ?? '';
  await page.keyboard.press('m');
  await expect(panel(page).getByRole('status').filter({ hasText: `Moved to ${rather}` })).toBeVisible();
  await expect.poll(names).not.toContain(first);
  const focused = () => page.evaluate(() => {
    let element = document.activeElement;
    while (element?.shadowRoot?.activeElement) element = element.shadowRoot.activeElement;
    return element?.className ?? '';
  });
  if ((await names()).length > 0) expect(await focused(), 'the next doubt has the focus').toContain('stay');

  await page.keyboard.press('u');
  await expect.poll(names).toContain(first);
  const last = planted.find((item) => item !== first) ?? '';
  const row = list.filter({ has: page.locator(`.doubted img[alt="${last}"]`) });
  await row.getByRole('button', { name: /^Leave in/ }).focus();
  await page.keyboard.press('k');
  await expect.poll(names).not.toContain(last);
  await page.keyboard.press('Escape');
  await page.reload();
  await expect(bench.picture).toBeVisible();
  await open(page, 'Doubts');
  const after = await names();
  expect(after).toContain(first);
  expect(after).not.toContain(last);

  // Taken in hand from there, and answered anew, it can be doubted anew.
  await page.getByRole('button', { name: `Take ${first} in hand` }).first().click();
  await expect(bench.picture).toHaveAttribute('alt', first);
});

test('the same item answered twice differently, and all but the same photo in two trays, are doubted', async ({ page, site }) => {
  const { bench } = await sorted(page, site, 60, 16);
  // Taken in hand and answered again: another tray.
  const result = await bench.result();
  const trays = await bench.trays();
  const [item, row] = [...result].find(([, { probability }]) => probability === '1.0000') ?? ['', undefined];
  const now = trays.indexOf(row?.tray ?? '');
  await page.locator('ken-shelves').getByRole('button', { name: new RegExp(`^${item}, `) }).click();
  await expect(bench.picture).toHaveAttribute('alt', item);
  const another = (now + 1) % trays.length;
  await page.keyboard.press(String(another + 1));
  await expect(page.locator('ken-shelves').getByRole('button', { name: `${item}, ${trays[another]}, your answer` })).toBeVisible();
  await open(page, 'Doubts');
  const raised = sheet(page).locator('.doubts > li').filter({ has: page.locator(`.doubted img[alt="${item}"]`) });
  await expect(raised).toHaveCount(1);
  await expect(raised).toContainText(new RegExp(`You put it in ${row?.tray} before|The other answers speak for`));
  await page.keyboard.press('Escape');

  // The same photo once more, saved anew and a little smaller, and put elsewhere.
  const [twin, of] = [...result].find(([one, { probability }]) => probability === '1.0000' && one !== item) ?? ['', undefined];
  const original = readFileSync(join(demoFolder, twin)).toString('base64');
  const again = await page.evaluate(async (bytes) => {
    const image = new Image();
    image.src = `data:image/jpeg;base64,${bytes}`;
    await image.decode();
    const canvas = document.createElement('canvas');
    canvas.width = Math.round(image.naturalWidth * 0.9);
    canvas.height = Math.round(image.naturalHeight * 0.9);
    canvas.getContext('2d')?.drawImage(image, 0, 0, canvas.width, canvas.height);
    return canvas.toDataURL('image/jpeg', 0.8).split(',')[1] ?? '';
  }, original);
  await bench.choose([{ name: 'again.jpg', mimeType: 'image/jpeg', buffer: Buffer.from(again, 'base64') }]);
  const tile = page.locator('ken-shelves').getByRole('button', { name: /^again\.jpg, / });
  await tile.click();
  await expect(bench.picture).toHaveAttribute('alt', 'again.jpg');
  const elsewhere = (trays.indexOf(of?.tray ?? '') + 1) % trays.length;
  await page.keyboard.press(String(elsewhere + 1));
  await expect(tile).toHaveAttribute('title', `again.jpg, ${trays[elsewhere]}, your answer`);
  await open(page, 'Doubts');
  const twins = sheet(page).locator('.doubts > li').filter({ hasText: 'All but the same lies in' });
  await expect(twins.first()).toBeVisible();
  expect([twin, 'again.jpg']).toContain(await twins.first().locator('.doubted img').getAttribute('alt'));
  expect([twin, 'again.jpg']).toContain(await twins.first().locator('.rather img').getAttribute('alt'));
});

/** Of N items with K wrong ones, the chance that none of n drawn is wrong. */
function noneOf(items: number, wrong: number, drawn: number): number {
  let chance = 1;
  for (let k = 0; k < drawn; k++) chance *= Math.max(0, items - wrong - k) / (items - k);
  return chance;
}

/** The least sample that rules out more than the tolerated share, by the plain product of chances. */
function leastSample(items: number, tolerance: number, confidence: number): number {
  const tolerated = Math.floor(tolerance * items + 1e-9);
  for (let drawn = 0; drawn <= items; drawn++) if (noneOf(items, tolerated + 1, drawn) <= 1 - confidence + 1e-12) return drawn;
  return items;
}

/** Looks at items of a spot check by keyboard, as the demo's answer sheet has it, until so many are left. */
async function lookUntil(page: Page, left: number): Promise<number> {
  const check = page.locator('ken-spot-check');
  let wrong = 0;
  for (;;) {
    const counted = /(\d+) of (\d+) looked at/.exec((await check.locator('.figures').textContent()) ?? '');
    const [done, of] = [Number(counted?.[1]), Number(counted?.[2])];
    if (of - done <= left) return wrong;
    const item = (await check.locator('.shown').getAttribute('alt')) ?? '';
    const asked = ((await check.getByRole('heading').textContent()) ?? '').replace(': is that right?', '').trim();
    const right = truth.get(item) ?? null;
    if (right === asked) {
      await page.keyboard.press('Enter');
    } else {
      wrong++;
      const button = check.locator('.trays button').filter({ hasText: right ?? 'no such tray' });
      const key = right === null || (await button.count()) === 0 ? 'n' : ((await button.locator('kbd').textContent()) ?? '');
      await page.keyboard.press(key.trim());
    }
    await expect(check.locator('.figures')).toHaveText(`${done + 1} of ${of} looked at`);
  }
}

test('a spot check from the draw to the sentence, across a reload', async ({ page, site }) => {
  const { bench } = await sorted(page, site, 110, 30);
  await open(page, 'Spot check');
  const said = (await sheet(page).locator('.big').textContent()) ?? '';
  const [, size, items] = (/(\d+)\s+to look at, of (\d+)/.exec(said.replace(/\s+/g, ' ')) ?? []).map(Number);
  expect(size).toBe(leastSample(items ?? 0, 0.05, 0.95));
  const before = await (async () => {
    await page.keyboard.press('Escape');
    const rows = await bench.result();
    await open(page, 'Spot check');
    return rows;
  })();
  expect([...before.values()].filter(({ tray, probability }) => tray !== '' && probability !== '1.0000').length, 'what the sorter sorted').toBeLessThanOrEqual(items ?? 0);
  await page.getByLabel('May be wrong in the end, at most').selectOption('0.1');
  await expect(sheet(page).locator('.big strong')).toHaveText(String(leastSample(items ?? 0, 0.1, 0.95)));
  const drawn = leastSample(items ?? 0, 0.1, 0.95);
  await page.getByRole('button', { name: `Start: look at ${drawn}` }).click();
  await expect(page.locator('ken-spot-check').getByRole('heading')).toContainText('is that right?');

  let wrong = await lookUntil(page, drawn - 5);
  // One key too many is taken back.
  const shown = await page.locator('ken-spot-check .shown').getAttribute('alt');
  await page.keyboard.press('n');
  await expect(page.locator('ken-spot-check .figures')).toHaveText(`6 of ${drawn} looked at`);
  await page.keyboard.press('u');
  await expect(page.locator('ken-spot-check .figures')).toHaveText(`5 of ${drawn} looked at`);
  await expect(page.locator('ken-spot-check .shown')).toHaveAttribute('alt', shown ?? '');

  await page.waitForTimeout(600);
  await page.reload();
  await expect(bench.picture).toBeVisible();
  await expect(page.locator('ken-trust-line')).toContainText(`Spot check: 5 of ${drawn} looked at`);
  await open(page, 'Spot check');
  await page.getByRole('button', { name: 'Go on' }).click();
  await expect(page.locator('ken-spot-check .shown'), 'where it was left').toHaveAttribute('alt', shown ?? '');
  wrong += await lookUntil(page, 0);
  await expect(page.locator('ken-spot-check').getByText(`${drawn - wrong} right, ${wrong} wrong.`)).toBeVisible();
  await page.keyboard.press('Enter');
  const sentence = page.locator('ken-trust-panel blockquote');
  await expect(sentence).toBeVisible();

  // The sentence is that of the core for the same check, and its bound that of the plain product where nothing was wrong.
  const { SpotCheck } = await core();
  const { check } = await kept(page);
  const stated = SpotCheck.restore(check?.check ?? '').statement(check?.date ?? '');
  await expect(sentence).toHaveText(stated.sentence);
  expect([stated.items, stated.lookedAt, stated.wrong, stated.untold]).toEqual([items, drawn, wrong, 0]);
  expect(stated.date).toMatch(/^\d{4}-\d{2}-\d{2}$/);
  if (wrong === 0) {
    let most = 0;
    while (noneOf(items ?? 0, most + 1, drawn) > 0.05 + 1e-12) most++;
    expect(stated.atMost).toBe(most);
  }
  await expect(sheet(page).getByText('This is about the pile as it is sorted now.')).toBeVisible();

  // A note to hand over, and the same in the table; nothing but what was looked at has changed.
  const download = page.waitForEvent('download');
  await page.getByRole('button', { name: 'Save a note to hand over' }).click();
  const note = await textOf(await download);
  expect(note).toContain(stated.sentence);
  expect(note).toContain('This is about the pile as it is sorted now.');
  await page.keyboard.press('Escape');
  const after = await bench.result();
  const looked = [...after].filter(([, { checked }]) => checked !== '' && checked !== undefined);
  expect(looked).toHaveLength(drawn);
  expect(looked.filter(([, { checked }]) => checked !== 'right')).toHaveLength(wrong);
  for (const [item, { tray, probability, checked }] of looked) {
    if (truth.get(item) !== null) expect([item, tray, probability]).toEqual([item, truth.get(item), '1.0000']);
    expect(checked === 'taken out').toBe(truth.get(item) === null);
  }
  for (const [item, { tray, probability }] of after) {
    if (!looked.some(([one]) => one === item)) expect([item, tray, probability]).toEqual([item, before.get(item)?.tray, before.get(item)?.probability]);
  }

  // It stays through a reload; with one more answer it is about the earlier sort, and undoing that makes it valid again.
  await page.waitForTimeout(600);
  await page.reload();
  await expect(bench.picture).toBeVisible();
  await expect(page.locator('ken-trust-line')).toContainText(stated.sentence);
  const item = await bench.inHand();
  await page.keyboard.press('c');
  await bench.nextAfter(item);
  await open(page, 'Spot check');
  await expect(sheet(page).getByText('This is about the sort as it was')).toBeVisible();
  await expect(sentence).toHaveText(stated.sentence);
  await page.keyboard.press('Escape');
  expect([...(await bench.result()).values()].every(({ checked }) => checked === undefined), 'no column that is not true any more').toBe(true);
  await page.keyboard.press('u');
  await open(page, 'Spot check');
  await expect(sheet(page).getByText('This is about the pile as it is sorted now.')).toBeVisible();
});

test('a spot check by tray goes tray by tray, and given up it leaves the answers', async ({ page, site }) => {
  const { bench } = await sorted(page, site, 70, 20);
  const answered = async () => [...(await bench.result()).values()].filter(({ probability }) => probability === '1.0000').length;
  const before = await answered();
  await open(page, 'Spot check');
  await page.getByLabel('May be wrong in the end, at most').selectOption('0.1');
  const plain = Number(await sheet(page).locator('.big strong').textContent());
  await page.getByLabel(/From each tray its share/).check();
  await expect.poll(async () => Number(await sheet(page).locator('.big strong').textContent())).toBeGreaterThanOrEqual(plain);
  await page.getByRole('button', { name: /^Start: look at/ }).click();
  const check = page.locator('ken-spot-check');
  const order: string[] = [];
  for (let looked = 0; looked < 6; looked++) {
    order.push((await check.getByRole('heading').textContent()) ?? '');
    await page.keyboard.press('Enter');
    await expect(check.locator('.figures')).toContainText(`${looked + 1} of`);
  }
  expect(order, 'tray by tray').toEqual([...order].sort((a, b) => order.indexOf(a) - order.indexOf(b)));
  await check.getByRole('button', { name: 'Pause' }).click();
  await open(page, 'Spot check');
  await page.getByRole('button', { name: 'Give it up' }).click();
  await expect(sheet(page).getByRole('button', { name: /^Start: look at/ })).toBeVisible();
  await page.keyboard.press('Escape');
  expect(await answered()).toBe(before + 6);
  await page.keyboard.press('u');
  await expect(page.getByText('Undone: the answers of a spot check.').first()).toBeVisible();
  expect(await answered()).toBe(before);
});

async function clean(page: Page, state: string): Promise<void> {
  await page.waitForTimeout(300);
  const { violations } = await new AxeBuilder({ page }).withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice']).analyze();
  expect(violations.map(({ id, nodes }) => `${id}: ${nodes.map((node) => `${node.html} ${node.failureSummary}`).join('\n')}`), state).toEqual([]);
}

for (const colorScheme of ['light', 'dark'] as const) {
  // Each colour scheme at one size: each size is looked at too, in half the time.
  for (const [size, viewport] of Object.entries(colorScheme === 'light' ? { phone: { width: 390, height: 844 } } : { desktop: { width: 1280, height: 800 } })) {
    test(`nothing for axe to find: ${colorScheme}, ${size}`, async ({ page, site }) => {
      await page.emulateMedia({ colorScheme, reducedMotion: 'reduce' });
      await page.setViewportSize(viewport);
      await sorted(page, site, 50, 18, [12]);
      await expect(page.locator('ken-trust-line svg')).toBeVisible();
      await clean(page, 'bench with the line');
      await open(page);
      await clean(page, 'how sure');
      for (const summary of await sheet(page).locator('summary').all()) await summary.click();
      await clean(page, 'with the tables');
      const fits = async () => expect(await page.locator('ken-trust-panel dialog, ken-spot-check dialog').evaluate((dialog) => dialog.scrollWidth <= dialog.clientWidth), 'no sideways scrolling').toBe(true);
      await fits();
      // Tabs by arrows, as is usual.
      await page.getByRole('tab', { name: /^How sure/ }).focus();
      await page.keyboard.press('ArrowRight');
      await expect(page.getByRole('tab', { name: /^Doubts/ })).toBeFocused();
      await clean(page, 'doubts');
      await fits();
      await page.keyboard.press('ArrowRight');
      await clean(page, 'planning a spot check');
      await fits();
      await page.getByLabel('May be wrong in the end, at most').selectOption('0.1');
      await page.getByRole('button', { name: /^Start: look at/ }).click();
      await expect(page.locator('ken-spot-check').getByRole('heading')).toBeVisible();
      await clean(page, 'looking');
      await fits();
      await lookUntil(page, 0);
      await clean(page, 'all looked at');
      await page.keyboard.press('Enter');
      await expect(page.locator('ken-trust-panel blockquote')).toBeVisible();
      await clean(page, 'the statement');
      await fits();
      await page.keyboard.press('Escape');
      await clean(page, 'bench with the statement');
    });
  }
}

test('notes are shown by their text: in doubts, in what gets confused and in a spot check', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  const kinds: [string, RegExp][] = [['Pumps', /pump/], ['Doors', /door/], ['Lamps', /lamp/i]];
  const sentences = ['The pump on deck N leaks water again', 'Cabin door N does not lock, its hinge is loose', 'Lamp N in the corridor is out, the bulb is blown'];
  const lines = Array.from({ length: 24 }, (_, k) => `${sentences[k % 3]?.replace('N', String(k + 1))}${k > 11 ? ', reported twice by the crew' : ''}`);
  const right = (text: string) => kinds.find(([, words]) => words.test(text))?.[0] ?? '';
  await page.getByRole('button', { name: 'Paste notes' }).click();
  await page.getByLabel('Notes, one a line').fill(lines.join('\n'));
  await page.getByRole('button', { name: 'Add 24 notes' }).click();
  await expect(page.getByRole('status').filter({ hasText: '24 notes added' })).toHaveCount(1, { timeout: 150_000 });

  const shown = page.locator('ken-question .mat');
  const inHand = async () => lines.find((line) => said.includes(line)) ?? '';
  let said = '';
  let planted = '';
  for (let answers = 0; answers < 12; answers++) {
    said = (await shown.textContent()) ?? '';
    const text = await inHand();
    const trays = await bench.trays();
    const lie = answers === 8 ? trays.find((tray) => tray !== right(text)) : undefined;
    if (lie) planted = text;
    const tray = lie ?? right(text);
    if (trays.includes(tray)) {
      await page.keyboard.press(String(trays.indexOf(tray) + 1));
    } else {
      await page.keyboard.press('t');
      await page.keyboard.type(tray);
      await page.keyboard.press('Enter');
    }
    await expect(shown).not.toContainText(text);
  }
  await open(page);
  await expect(sheet(page).locator('.pairs .tile').filter({ hasText: planted })).toHaveCount(1);
  await clean(page, 'how sure, of notes');
  await page.getByRole('tab', { name: /^Doubts/ }).click();
  await expect(sheet(page).locator('.doubted').first()).toContainText(planted);
  await clean(page, 'doubts about notes');
  await page.getByRole('tab', { name: /^Spot check/ }).click();
  await page.getByRole('button', { name: /^Start: look at/ }).click();
  const check = page.locator('ken-spot-check');
  said = (await check.locator('.shown').textContent()) ?? '';
  expect(await inHand()).not.toBe('');
  await expect(check.locator('.line').first()).toBeVisible();
  await clean(page, 'looking at notes');
});
