import { mkdirSync, mkdtempSync, readFileSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { crc32, deflateSync } from 'node:zlib';
import type { CDPSession, Page } from '@playwright/test';
import { Bench, demoFile, expect, test } from './fixtures';

const jpeg = (index: number, name: string) => ({ name, mimeType: 'image/jpeg', buffer: readFileSync(demoFile(index)) });

/** A grey PNG whose pixels would need far more memory than its file (W3C PNG specification, third edition). */
function hugePng(side: number): Buffer {
  const chunk = (type: string, data: Buffer) => {
    const body = Buffer.concat([Buffer.from(type, 'latin1'), data]);
    const frame = Buffer.alloc(8);
    frame.writeUInt32BE(data.length, 0);
    frame.writeUInt32BE(crc32(body), 4);
    return Buffer.concat([frame.subarray(0, 4), body, frame.subarray(4)]);
  };
  const header = Buffer.alloc(13);
  header.writeUInt32BE(side, 0);
  header.writeUInt32BE(side, 4);
  header[8] = 1;
  const rows = Buffer.alloc(side * (1 + Math.ceil(side / 8)));
  const signature = Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]);
  return Buffer.concat([signature, chunk('IHDR', header), chunk('IDAT', deflateSync(rows)), chunk('IEND', Buffer.alloc(0))]);
}

async function drop(page: Page, devtools: CDPSession, files: string[]): Promise<void> {
  const data = { items: [], files, dragOperationsMask: 1 };
  for (const type of ['dragEnter', 'dragOver', 'drop'] as const) {
    await devtools.send('Input.dispatchDragEvent', { type, x: 640, y: 500, data });
  }
  await page.waitForTimeout(50);
}

test('bad files get one message each, the rest goes on', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  const whole = readFileSync(demoFile(2));
  await bench.choose([
    jpeg(0, 'good.jpg'),
    { name: 'letter.jpg', mimeType: 'image/jpeg', buffer: Buffer.from('Dear all,\nthis is no picture.\n') },
    { name: 'cut.jpg', mimeType: 'image/jpeg', buffer: whole.subarray(0, Math.floor(whole.length / 2)) },
    { name: 'nothing.jpg', mimeType: 'image/jpeg', buffer: Buffer.alloc(0) },
    { name: 'huge.png', mimeType: 'image/png', buffer: hugePng(20_000) },
    jpeg(0, 'twin.jpg'),
    jpeg(1, 'last.jpg'),
  ]);
  await bench.allRead();
  const lines = await page.locator('ken-reading li').allTextContents();
  for (const line of lines) console.log(`  ${line}`);
  for (const name of ['letter.jpg', 'cut.jpg', 'nothing.jpg', 'huge.png']) {
    expect(lines.filter((line) => line.includes(name)), `one line for ${name}`).toHaveLength(1);
  }
  expect(lines).toHaveLength(4);
  await expect(page.getByText('1 file was in the pile already and added only once: twin.jpg (same as good.jpg).')).toBeVisible();
  expect([...(await bench.result()).keys()].sort()).toEqual(['good.jpg', 'last.jpg']);

  await page.getByRole('button', { name: 'Dismiss' }).click();
  await bench.choose([jpeg(3, 'after.jpg')]);
  await bench.allRead();
  expect((await bench.result()).size).toBe(3);
});

test('a dropped folder is read with its subfolders; an empty one gets one line', async ({ page, context, site }) => {
  const folder = mkdtempSync(join(tmpdir(), 'pile-'));
  mkdirSync(join(folder, 'finds/deep'), { recursive: true });
  mkdirSync(join(folder, 'empty'));
  writeFileSync(join(folder, 'finds/b.jpg'), readFileSync(demoFile(0)));
  writeFileSync(join(folder, 'finds/deep/a.jpg'), readFileSync(demoFile(1)));
  writeFileSync(join(folder, 'finds/.hidden'), 'x');
  const bench = new Bench(page, site);
  await bench.open();
  const devtools = await context.newCDPSession(page);
  await drop(page, devtools, [join(folder, 'empty')]);
  await expect(page.getByText('empty: this folder holds no files.')).toBeVisible();
  await drop(page, devtools, [join(folder, 'finds')]);
  await bench.allRead();
  expect([...(await bench.result()).keys()].sort()).toEqual(['finds/b.jpg', 'finds/deep/a.jpg']);
});

test('a chosen folder keeps its paths', async ({ page, site }) => {
  const folder = mkdtempSync(join(tmpdir(), 'pile-'));
  mkdirSync(join(folder, 'finds'));
  writeFileSync(join(folder, 'finds/b.jpg'), readFileSync(demoFile(0)));
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose(join(folder, 'finds'), 'Choose a folder');
  await bench.allRead();
  expect([...(await bench.result()).keys()]).toEqual(['finds/b.jpg']);
});

test('names can’t become formulas or break the table', async ({ page, site }) => {
  const bench = new Bench(page, site);
  await bench.open();
  await bench.choose([jpeg(0, '=1+1.jpg'), jpeg(1, 'comma, "quote".jpg'), jpeg(2, '@sum.jpg')]);
  await bench.allRead();
  await bench.answer('+plus, "tray"');
  await bench.answer('-minus');
  await bench.answer(null);
  const result = await bench.result();
  expect([...result.keys()].sort()).toEqual(["'=1+1.jpg", "'@sum.jpg", 'comma, "quote".jpg']);
  expect([...result.values()].map(({ tray }) => tray).sort()).toEqual(['', "'+plus, \"tray\"", "'-minus"]);
});

test('the camera adds pictures', async ({ page, context, site }) => {
  await context.grantPermissions(['camera'], { origin: new URL(site.address).origin });
  const bench = new Bench(page, site);
  await bench.open();
  await page.getByRole('button', { name: 'Take pictures' }).click();
  await page.getByRole('button', { name: 'Take picture', exact: true }).click();
  await expect(page.getByText('1 photo taken.')).toBeVisible();
  await page.getByRole('button', { name: 'Done' }).click();
  await bench.allRead();
  expect((await bench.result()).size).toBe(1);
});

test('a refused camera says what to do', async ({ page, site }) => {
  await new Bench(page, site).open();
  await page.getByRole('button', { name: 'Take pictures' }).click();
  await expect(page.getByText(/was not allowed to use the camera/)).toBeVisible();
});
