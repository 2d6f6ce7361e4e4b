// Makes the README's pictures from the built page and the demo pile: pkg-scripts/screenshots
import { mkdir, readFile, stat } from 'node:fs/promises';
import { chromium } from '@playwright/test';
import { serve } from './serve.mjs';

const ANSWERS = 26;
const MOST_BYTES = 250_000;
const shots = [
  { file: 'docs/page-desktop.jpg', viewport: { width: 1280, height: 860 }, colorScheme: 'light', deviceScaleFactor: 1, quality: 84 },
  { file: 'docs/page-phone.jpg', viewport: { width: 390, height: 844 }, colorScheme: 'dark', deviceScaleFactor: 2, quality: 74 },
];

const index = JSON.parse(await readFile('www/demo/pile/index.json', 'utf8'));
const truth = new Map(index.items.map(({ file, tray }) => [file, tray]));
const { server, address } = await serve('www/app/dist', 4700);
const browser = await chromium.launch({
  executablePath: process.env.CHROMIUM ?? '/usr/bin/chromium',
  args: ['--no-sandbox', '--disable-gpu', '--disable-background-networking'],
});
await mkdir('docs', { recursive: true });

for (const { file, quality, ...look } of shots) {
  const page = await browser.newPage({ ...look, reducedMotion: 'reduce' });
  await page.goto(address);
  await page.getByRole('button', { name: 'Try the demo pile' }).click();
  await page.getByText(`${index.items.length} photos added.`).first().waitFor({ state: 'attached', timeout: 180_000 });
  const picture = page.locator('ken-question .mat img');
  for (let answers = 0; answers < ANSWERS; answers++) {
    const item = await picture.getAttribute('alt');
    const tray = truth.get(item);
    const place = (await page.locator('ken-question .rows .label').allTextContents()).indexOf(tray);
    if (tray === null) await page.keyboard.press('n');
    else if (place >= 0) await page.keyboard.press(String((place + 1) % 10));
    else {
      await page.keyboard.press('t');
      await page.keyboard.type(tray);
      await page.keyboard.press('Enter');
    }
    await page.waitForFunction(
      (before) => document.querySelector('ken-bench').shadowRoot.querySelector('ken-question').item?.name !== before,
      item,
    );
  }
  await page.waitForLoadState('networkidle');
  await page.waitForTimeout(500);
  await page.screenshot({ path: file, type: 'jpeg', quality });
  const { size } = await stat(file);
  console.log(`  ${file}  ${Math.round(size / 1000)} kB`);
  if (size > MOST_BYTES) throw new Error(`${file} is larger than ${MOST_BYTES / 1000} kB: lower its quality`);
  await page.close();
}

await browser.close();
server.close();
server.closeAllConnections();
