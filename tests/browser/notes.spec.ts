import { readFileSync, statSync } from 'node:fs';
import { join } from 'node:path';
import AxeBuilder from '@axe-core/playwright';
import type { Page } from '@playwright/test';
import { bundledText } from './bundled';
import { Bench, demo, demoFile, demoFolder, expect, parseCsv, root, type Site, test, textOf } from './fixtures';

const notesFolder = join(root, 'www/demo/notes');
const [header = [], ...log] = parseCsv(readFileSync(join(notesFolder, 'log.csv'), 'utf8'));
/** The answer sheet, which the page never sees: the tray of each number, none for a stray. */
const sheet = new Map(
  parseCsv(readFileSync(join(notesFolder, 'answers.csv'), 'utf8'))
    .slice(1)
    .map(([number = '', tray = '']) => [number, tray]),
);
const truth = new Map(log.map(([number = '', note = '']) => [note, sheet.get(number) || null]));

const ANSWERS_PER_TRAY = 5;
const LEAST_SHARE = 0.85;

/** What the result adds to the columns that came. */
const ADDED = ['tray', 'probability', 'plausible', 'set aside'];
const NOTHING = ADDED.map(() => '');

class NoteBench extends Bench {
  constructor(page: Page, site: Site) {
    super(page, site);
  }

  /** The note in hand. */
  get note() {
    return this.page.locator('ken-question .mat .text');
  }

  override async inHand(): Promise<string> {
    return (await this.note.textContent()) ?? '';
  }

  override async nextAfter(item: string): Promise<void> {
    const shown = () => this.note.evaluateAll((all) => all.map((one) => one.textContent));
    await expect(async () => expect((await shown())[0]).not.toBe(item)).toPass({ intervals: [5, 10, 20], timeout: 15_000 });
  }

  async loadDemoNotes(): Promise<void> {
    await this.page.getByRole('button', { name: 'Try the demo notes' }).click();
    await this.allRead();
  }

  override async allRead(): Promise<void> {
    await expect(this.page.getByRole('status').filter({ hasText: /notes? added|No new note/ })).toHaveCount(1, { timeout: 150_000 });
    await expect(this.page.locator('ken-reading progress')).toHaveCount(0);
  }

  async chooseNotes(files: string | string[] | { name: string; mimeType: string; buffer: Buffer }[]): Promise<void> {
    if (await this.page.getByRole('button', { name: 'Add notes', exact: true }).isVisible()) {
      await this.page.getByRole('button', { name: 'Add notes', exact: true }).click();
    }
    const chooser = this.page.waitForEvent('filechooser');
    await this.page.getByRole('button', { name: 'Choose notes' }).click();
    await (await chooser).setFiles(files as string[]);
  }

  /** The whole table that the page hands over. */
  async table(): Promise<string[][]> {
    const download = this.page.waitForEvent('download');
    await this.page.getByRole('button', { name: 'Take result' }).click();
    return parseCsv(await textOf(await download));
  }

  get panel() {
    return this.page.getByRole('dialog');
  }

  async openKits(): Promise<void> {
    await this.page.getByRole('button', { name: 'Kits', exact: true }).click();
    await expect(this.panel.getByRole('heading', { name: 'Your kits' })).toBeVisible();
  }
}

const text = (name: string, content: string | Buffer) => [{ name, mimeType: 'text/plain', buffer: Buffer.from(content) }];

async function clean(page: Page, state: string): Promise<void> {
  await page.waitForTimeout(400);
  const { violations } = await new AxeBuilder({ page }).withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice']).analyze();
  const found = violations.map(({ id, nodes }) => `${id}: ${nodes.map((node) => `${node.html} ${node.failureSummary}`).join('\n')}`);
  expect(found, state).toEqual([]);
}

test('what the page says of the text encoder before it is fetched is true', () => {
  const sum = readFileSync(join(root, 'www/encoders/text.sha256'), 'utf8').slice(0, 32);
  expect(bundledText.textIdentity).toBe(`all-minilm-l6-v2:${sum}`);
  expect(bundledText.textEncoderBytes).toBe(statSync(join(root, 'www/encoders/text.onnx')).size);
});

test('the whole job on the demo notes: the encoder comes with the first note, then all goes with the network cut', async ({ page, context, site }) => {
  test.setTimeout(400_000);
  const fetched: string[] = [];
  context.on('request', (request) => fetched.push(new URL(request.url()).pathname));
  const encoders = () => fetched.filter((path) => /text-[^/]*\.onnx$/.test(path));
  const bench = new NoteBench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  await page.waitForTimeout(1500);
  expect(encoders(), 'nothing of it before the first note').toEqual([]);
  await bench.loadDemoNotes();
  expect(encoders().length, 'with the first note').toBeGreaterThan(0);

  await context.setOffline(true);
  await site.stop();
  await page.reload();
  await expect(bench.note).toBeVisible();

  const answered = new Set<string>();
  const trays = new Set([...truth.values()].filter((tray) => tray !== null));
  while (answered.size < ANSWERS_PER_TRAY * trays.size) {
    const note = await bench.inHand();
    const tray = truth.get(note);
    expect(tray, `${note} is in the answer sheet`).not.toBeUndefined();
    await bench.answer(tray ?? null);
    if (tray) answered.add(note);
  }
  const [names, ...rows] = await bench.table();
  expect(names).toEqual([...header, ...ADDED]);
  expect(rows.map(([number, note]) => [number, note]), 'every row comes back as it came').toEqual(log);
  const shown = rows.filter(([, note = '']) => truth.get(note));
  const right = (of: string[][]) => of.filter(([, note = '', tray]) => truth.get(note) === tray).length;
  const open = shown.filter(([, note = '']) => !answered.has(note));
  const percent = (of: string[][]) => `${((100 * right(of)) / of.length).toFixed(1)} %`;
  console.log(
    `  demo notes: ${trays.size} trays, ${answered.size} answers; ${percent(shown)} of ${shown.length} in the right tray, ` +
      `${percent(open)} of the ${open.length} never asked about`,
  );
  expect(right(shown) / shown.length).toBeGreaterThanOrEqual(LEAST_SHARE);

  // More notes, with the network still cut: the encoder is on the device.
  await page.getByRole('button', { name: 'Add notes', exact: true }).click();
  await page.getByRole('button', { name: 'Paste notes' }).click();
  await page.getByLabel('Notes, one a line').fill('The starboard engine coughs black smoke at half speed.\n\nFound: one red mitten on the car deck.');
  await page.getByRole('button', { name: 'Add 2 notes' }).click();
  await bench.allRead();
  const [, ...more] = await bench.table();
  expect(more).toHaveLength(log.length + 2);
});

test('a visit with photos only fetches nothing of the text encoder', async ({ page, context, site }) => {
  const fetched: string[] = [];
  context.on('request', (request) => fetched.push(request.url()));
  const bench = new Bench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  await bench.choose([0, 1, 2].map(demoFile));
  await bench.allRead();
  await bench.answer('First');
  await bench.answer('Second');
  await bench.result();
  await page.reload();
  await expect(bench.picture).toBeVisible();
  expect(fetched.filter((url) => /photo-[^/]*\.onnx$/.test(url)).length, 'requests are seen').toBeGreaterThan(0);
  expect(fetched.filter((url) => /text-[^/]*\.onnx$/.test(url))).toEqual([]);
  const kept = await page.evaluate(async () => {
    const urls = await Promise.all((await caches.keys()).map(async (name) => (await (await caches.open(name)).keys()).map(({ url }) => url)));
    return urls.flat();
  });
  expect(kept.length).toBeGreaterThan(0);
  expect(kept.filter((url) => /text-[^/]*\.onnx/.test(url))).toEqual([]);
});

test('a table: the column is chosen with its first notes in sight, and all other columns come back', async ({ page, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  const table = [
    ['id', 'what happened', 'by', 'cost', 'tray'],
    ['7', 'The zip is stuck halfway, "again"', 'Ann\nB.', '-5', 'x'],
    ['8', 'Left sleeve torn at the cuff; lining, too', '=1+1', '+1,5', ''],
    ['9', '', '@sum', '3', 'no note in this row'],
    ['10', 'The zip is stuck halfway, "again"', '-cmd', '', 'twice the same'],
    ['11', 'זה לא נסגר', '', '2', ''],
  ];
  const csv = table.map((row) => row.map((cell) => `"${cell.replaceAll('"', '""')}"`).join(',')).join('\r\n');
  await bench.chooseNotes(text('repairs.csv', `${csv}\r\n12,"a","b","c","d","one cell too many"\r\n`));
  const column = bench.panel.getByLabel('Which column holds the notes?');
  await expect(column).toHaveValue('1');
  await expect(bench.panel.getByText('Left sleeve torn')).toBeVisible();
  await column.selectOption({ label: 'by' });
  await expect(bench.panel.getByText('@sum')).toBeVisible();
  await column.selectOption({ label: 'what happened' });
  await expect(bench.panel.getByText('5 rows, 1 of them without a note: these come back as they are.')).toBeVisible();
  await clean(page, 'choosing a column');
  await bench.panel.getByRole('button', { name: 'Add 4 notes' }).click();
  await bench.allRead();
  await expect(page.getByText(/repairs\.csv: 1 row left out\. Line \d+: it has 6 cells/)).toBeVisible();
  await expect(page.getByText(/1 note with the text of another/)).toBeVisible();
  await expect(bench.note).toHaveAttribute('dir', 'auto');
  for (const tray of ['Zips', '+Cloth', 'Other']) await bench.answer(tray);

  const [names, ...rows] = await bench.table();
  expect(names, 'the input had a column “tray”').toEqual(['id', 'what happened', 'by', 'cost', 'tray', "tray'", ...ADDED.slice(1)]);
  // As they came, but for cells that a spreadsheet would run.
  const harmless: Record<string, string> = { '=1+1': "'=1+1", '@sum': "'@sum", '-cmd': "'-cmd" };
  expect(rows.map((row) => row.slice(0, 5))).toEqual(table.slice(1).map((row) => row.map((cell) => harmless[cell] ?? cell)));
  const tray = Object.fromEntries(rows.map((row) => [row[0], row[5]]));
  expect(tray['9'], 'nothing for the row without a note').toBe('');
  expect(tray['10'], 'one answer is for both').toBe(tray['7']);
  expect(new Set([tray['7'], tray['8'], tray['11']])).toEqual(new Set(['Zips', "'+Cloth", 'Other']));

  // The whole row at one key, and everything again after a reload.
  await page.getByText('Left sleeve torn').first().click();
  await page.keyboard.press('z');
  await expect(bench.panel.getByText('=1+1')).toBeVisible();
  await clean(page, 'the whole row');
  await page.keyboard.press('Escape');
  await page.reload();
  await expect(page.getByRole('heading', { name: 'Nothing left to ask' })).toBeVisible();
  expect(await bench.table()).toEqual([names, ...rows]);
  await bench.chooseNotes(text('repairs.csv', `${csv}\r\n12,"a","b","c","d","one cell too many"\r\n`));
  await bench.panel.getByRole('button', { name: 'Add 4 notes' }).click();
  await expect(page.getByText('repairs.csv: all of its notes are in the pile already.')).toBeVisible();
});

test('tab-separated values and JSON lines', async ({ page, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  await bench.chooseNotes([
    ...text('a.tsv', 'note\tby\nthe zip, stuck\tAnn\n'),
    ...text('b.jsonl', '{"text": "a torn sleeve", "by": "Bo", "n": 3}\n{"text": "a lost button"}\n'),
  ]);
  await bench.panel.getByRole('button', { name: 'Add 1 note' }).click();
  await expect(bench.panel.getByText('a lost button')).toBeVisible();
  await bench.panel.getByRole('button', { name: 'Add 2 notes' }).click();
  await bench.allRead();
  expect(await bench.table()).toEqual([
    ['file', 'note', 'by', 'n', 'text', ...ADDED],
    ['a.tsv', 'the zip, stuck', 'Ann', '', '', ...NOTHING],
    ['b.jsonl', '', 'Bo', '3', 'a torn sleeve', ...NOTHING],
    ['b.jsonl', '', '', '', 'a lost button', ...NOTHING],
  ]);
});

test('one file of text is a note a line, several are a note each, and either can be changed', async ({ page, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  await bench.chooseNotes(text('list.txt', 'the zip is stuck\n\na sleeve is torn\n'));
  await expect(bench.panel.getByLabel('Every line: 2 notes')).toBeChecked();
  await clean(page, 'lines or files');
  await bench.panel.getByRole('button', { name: 'Add 2 notes' }).click();
  await bench.allRead();
  await bench.chooseNotes([...text('one.txt', 'first line\n\nsecond line\n'), ...text('two.txt', 'another letter\n')]);
  await expect(bench.panel.getByLabel('Every file: 2 notes')).toBeChecked();
  await bench.panel.getByRole('button', { name: 'Add 2 notes' }).click();
  await expect(page.locator('ken-band').getByText('4 notes')).toBeVisible();
  expect((await bench.table()).slice(1)).toEqual([
    ['list.txt', 'the zip is stuck', '', ...NOTHING],
    ['list.txt', 'a sleeve is torn', '', ...NOTHING],
    ['2 files.jsonl', 'first line\n\nsecond line', 'one.txt', ...NOTHING],
    ['2 files.jsonl', 'another letter', 'two.txt', ...NOTHING],
  ]);
});

test('encodings are recognised, guessed and said, or refused', async ({ page, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  const said = 'Müller’s zip — 5 €';
  await bench.chooseNotes(text('utf16.txt', Buffer.concat([Buffer.from([0xff, 0xfe]), Buffer.from(said, 'utf16le')])));
  await expect(bench.panel.getByText(said)).toBeVisible();
  await expect(bench.panel.getByText('Read as Windows-1252')).toBeHidden();
  await bench.panel.getByRole('button', { name: 'Add 1 note' }).click();
  await bench.allRead();
  // Windows-1252: ü FC, ’ 92, — 97, € 80 (WHATWG Encoding Standard, index windows-1252).
  await bench.chooseNotes(text('1252.csv', Buffer.from('note\nM\xfcller\x92s sleeve \x97 7 \x80\n', 'latin1')));
  await expect(bench.panel.getByText('Read as Windows-1252')).toBeVisible();
  await expect(bench.panel.getByText('Müller’s sleeve — 7 €')).toBeVisible();
  await bench.panel.getByRole('button', { name: 'Add 1 note' }).click();
  await expect(page.locator('ken-band').getByText('2 notes')).toBeVisible();

  await bench.chooseNotes([
    ...text('picture.txt', readFileSync(demoFile(0))),
    ...text('open.csv', 'note,by\n"never closed,Ann\n'),
    ...text('empty.jsonl', '\n'),
  ]);
  await expect(page.getByText(/^picture\.txt: it is not text in UTF-8, UTF-16 or Windows-1252 .*save it as UTF-8/)).toBeVisible();
  await expect(page.getByText(/^open\.csv: the quotation mark that opens a cell in line 2 is never closed/)).toBeVisible();
  await expect(page.getByText(/^empty\.jsonl: there is no note in it/)).toBeVisible();
  expect((await bench.table()).slice(1).map((row) => row[1]), 'what was there stays').toEqual([said, 'Müller’s sleeve — 7 €']);
});

test('a long note is shown whole, scrolls, and is said to be read in parts; one with no text is refused with its line', async ({ page, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  const long = Array.from({ length: 400 }, (_, at) => `word${at}`).join(' ');
  await bench.chooseNotes(text('long.csv', `note,by\n"${long}",Ann\n\u200b,Bo\n`));
  await bench.panel.getByRole('button', { name: 'Add 2 notes' }).click();
  await bench.allRead();
  await expect(bench.note).toHaveText(long);
  await expect(page.getByText(/Long: read in \d+ parts and averaged\./)).toBeVisible();
  await expect(page.getByText(/1 note is longer than about 180 words/)).toBeVisible();
  await expect(page.getByText('long.csv, line 3: there is no text in it')).toBeVisible();
  await bench.note.focus();
  await page.keyboard.press('End');
  await expect(async () => expect(await bench.note.evaluate((element) => element.scrollTop)).toBeGreaterThan(50)).toPass();
});

test('without the encoder and without a network the page says so, and goes on when there is one', async ({ page, context, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  await context.route(/text-[^/]*\.onnx$/, (route) => route.abort());
  await page.getByRole('button', { name: 'Try the demo notes' }).click();
  await expect(page.getByText(/Could not load .*text-.*Connect once, then try again/)).toBeVisible();
  await context.unroute(/text-[^/]*\.onnx$/);
  await page.getByRole('button', { name: 'Read the rest' }).click();
  await bench.allRead();
  expect((await bench.table()).length).toBe(log.length + 1);
});

test('fetching the encoder shows how far it is and can be stopped', async ({ page, context, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  await page.evaluate(async () => void (await navigator.serviceWorker.ready));
  let letGo = () => {};
  const held = new Promise<void>((resolve) => (letGo = resolve));
  await context.route(/text-[^/]*\.onnx$/, async (route) => {
    await held;
    // By then nobody may wait for it any more.
    await route.abort().catch(() => undefined);
  });
  await page.getByRole('button', { name: 'Try the demo notes' }).click();
  await expect(page.getByText('Fetching the reader for notes, once: 0.0 of 22.7 MB.')).toBeVisible();
  await page.getByRole('button', { name: 'Stop' }).click();
  await expect(page.getByText('Stopped after 0 of 164.')).toBeVisible();
  await expect(page.locator('ken-reading .problem')).toHaveCount(0);
  letGo();
  await context.unroute(/text-[^/]*\.onnx$/);
  await page.getByRole('button', { name: 'Read the rest' }).click();
  await bench.allRead();
  await expect(page.locator('ken-band').getByText('164 notes')).toBeVisible();
});

test('pasted lines are shown first, then added', async ({ page, site }) => {
  const bench = new NoteBench(page, site);
  await bench.open();
  await page.evaluate(() => {
    const clipboardData = new DataTransfer();
    clipboardData.setData('text/plain', 'the zip is stuck\r\na sleeve is torn\r\n');
    dispatchEvent(new ClipboardEvent('paste', { clipboardData, bubbles: true }));
  });
  await expect(bench.panel.getByText('2 notes: every line becomes one.')).toBeVisible();
  await clean(page, 'pasting notes');
  await page.keyboard.press('Enter');
  await bench.allRead();
  expect((await bench.table()).map(([note]) => note)).toEqual(['note', 'the zip is stuck', 'a sleeve is torn']);
});

test('photos and notes are kept in kits of their own', async ({ page, site }) => {
  test.setTimeout(300_000);
  const bench = new NoteBench(page, site);
  await bench.open();
  await bench.chooseNotes(text('list.txt', 'the zip is stuck\na sleeve is torn\nno light\n'));
  await bench.panel.getByRole('button', { name: 'Add 3 notes' }).click();
  await bench.allRead();
  await bench.answer('Zips');
  await bench.answer('Sleeves');

  // Photos into the kit of notes: a choice, and nothing is mixed.
  const drop = async (files: { name: string; type: string; bytes: string }[]) =>
    page.evaluate((given) => {
      const dataTransfer = new DataTransfer();
      for (const { name, type, bytes } of given) {
        dataTransfer.items.add(new File([Uint8Array.from(atob(bytes), (c) => c.charCodeAt(0))], name, { type }));
      }
      dispatchEvent(new DragEvent('drop', { dataTransfer, bubbles: true, cancelable: true }));
    }, files);
  const picture = (index: number) => ({ name: demo[index]?.file ?? '', type: 'image/jpeg', bytes: readFileSync(demoFile(index)).toString('base64') });
  await drop([picture(0), picture(1)]);
  await expect(bench.panel.getByRole('heading', { name: 'Photos into a kit of notes?' })).toBeVisible();
  await clean(page, 'photos into a kit of notes');
  await bench.panel.getByRole('button', { name: 'Nowhere: leave out' }).click();
  await expect(page.locator('ken-band').getByText('3 notes')).toBeVisible();
  await drop([picture(0), picture(1)]);
  await bench.panel.getByRole('button', { name: 'Into another kit' }).click();
  await expect(page.locator('ken-band').getByText('2 photos')).toBeVisible();
  const photos = new Bench(page, site);
  await photos.answer('Finds');
  expect((await photos.result()).size).toBe(2);

  // Notes into the kit of photos: back into the kit that holds notes.
  await drop([{ name: 'more.csv', type: 'text/csv', bytes: Buffer.from('note\nno water\n').toString('base64') }]);
  await bench.panel.getByRole('button', { name: 'Into “list”' }).click();
  await expect(page.locator('ken-band').getByText('4 notes')).toBeVisible();
  await expect(bench.shelf('Zips')).toBeVisible();
  await expect(bench.shelf('Finds')).toHaveCount(0);
  const [names, ...rows] = await bench.table();
  expect(names).toEqual(['file', 'note', ...ADDED]);
  expect(rows.map(([file]) => file)).toEqual(['list.txt', 'list.txt', 'list.txt', 'more.csv']);

  // The list: names, opening, deleting with a second press.
  await bench.openKits();
  await expect(bench.panel.getByText('4 notes, 2 trays, 2 answers, open now')).toBeVisible();
  await expect(bench.panel.getByText('2 photos, 1 tray, 1 answer')).toBeVisible();
  await clean(page, 'kits');
  await bench.panel.getByRole('button', { name: 'Rename Photos' }).click();
  await bench.panel.getByLabel('Name of the kit').fill('list');
  await page.keyboard.press('Enter');
  await expect(bench.panel.getByText('Another kit is called list.')).toBeVisible();
  await bench.panel.getByLabel('Name of the kit').fill('Trench 4');
  await page.keyboard.press('Enter');
  await bench.panel.getByRole('button', { name: 'Open Trench 4' }).click();
  await expect(photos.picture).toBeVisible();
  await page.reload();
  await expect(photos.picture).toBeVisible();
  await bench.openKits();
  await bench.panel.getByRole('button', { name: 'Delete list' }).click();
  await bench.panel.getByRole('button', { name: 'Delete for good?' }).click();
  await expect(bench.panel.getByText('list', { exact: true })).toHaveCount(0);
  expect(await page.evaluate(async () => (await indexedDB.databases()).map(({ name }) => name))).not.toContain('kenspeckle');
  await bench.panel.getByRole('button', { name: 'Start another kit' }).click();
  await expect(page.getByRole('button', { name: 'Open Trench 4' })).toBeVisible();
  await clean(page, 'empty page with a kit');
  await page.getByRole('button', { name: 'Open Trench 4' }).click();
  await expect(bench.shelf('Finds')).toBeVisible();
});

for (const colorScheme of ['light', 'dark'] as const) {
  // Each colour scheme at one size: each size is looked at too, in half the time.
  for (const [size, viewport] of Object.entries(colorScheme === 'light' ? { phone: { width: 390, height: 844 } } : { desktop: { width: 1280, height: 800 } })) {
    test(`a pile of notes has nothing for axe to find: ${colorScheme}, ${size}`, async ({ page, site }) => {
      await page.emulateMedia({ colorScheme, reducedMotion: 'reduce' });
      await page.setViewportSize(viewport);
      const bench = new NoteBench(page, site);
      await bench.open();
      await bench.loadDemoNotes();
      await clean(page, 'unsorted notes');
      for (let given = 0; given < 8; given++) await bench.answer(truth.get(await bench.inHand()) ?? null);
      await clean(page, 'sorted notes');
      expect(await page.evaluate(() => document.documentElement.scrollWidth <= innerWidth), 'no sideways scrolling').toBe(true);
    });
  }
}

test('notes can be sorted with past piles of notes, and starters of photos do not get there', async ({ page, site }) => {
  test.setTimeout(600_000);
  const bench = new NoteBench(page, site);
  await bench.open();
  await bench.loadDemoNotes();
  for (let given = 0; given < 16; given++) await bench.answer(truth.get(await bench.inHand()) ?? null);
  await bench.table();
  await page.getByRole('button', { name: 'Learn from this pile' }).click();
  await expect(page.getByRole('status').filter({ hasText: /Learned from/ })).toHaveCount(1, { timeout: 400_000 });
  await bench.openKits();
  await bench.panel.getByRole('button', { name: 'Start another kit' }).click();
  await expect(page.getByText('The next pile of notes starts from what past piles taught')).toBeVisible();
  await bench.choose([join(demoFolder, demo[0]?.file ?? ''), join(demoFolder, demo[1]?.file ?? '')]);
  await expect(page.locator('ken-band').getByText('2 photos')).toBeVisible();
  await expect(page.locator('ken-starter-line'), 'nothing for photos').toBeEmpty();
  await bench.openKits();
  await bench.panel.getByRole('button', { name: 'Start another kit' }).click();
  await bench.chooseNotes(text('list.csv', 'note\nthe zip is stuck\na sleeve is torn\n'));
  await bench.allRead();
  await expect(page.locator('ken-starter-line')).toContainText('Starts from what past piles taught');
});
