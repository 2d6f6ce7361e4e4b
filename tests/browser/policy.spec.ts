import { expect, test } from './fixtures';

test('the page is served with its policy, carries it, and holds nothing inline', async ({ request, site }) => {
  const response = await request.get(site.address);
  const html = await response.text();
  const carried = /http-equiv="Content-Security-Policy" content="([^"]+)"/.exec(html)?.[1]?.replaceAll('&#39;', "'");
  expect(response.headers()['content-security-policy']).toBe(carried);
  const rules = new Map((carried ?? '').split('; ').map((rule) => [rule.split(' ')[0], rule.split(' ').slice(1).join(' ')]));
  expect(rules.get('default-src')).toBe("'self'");
  expect(rules.get('script-src')).toBe("'self' 'wasm-unsafe-eval'");
  expect(rules.get('style-src')).toBe("'self'");
  expect(rules.get('worker-src')).toBe("'self'");
  expect(html).not.toMatch(/<style|style=|<script(?![^>]* src=)|https?:\/\//);
});

test.describe('a request to another origin', () => {
  test.use({ provoked: 'https://elsewhere.invalid/' });

  test('is stopped by the policy', async ({ page, site }) => {
    await page.goto(site.address);
    const outcome = await page.evaluate(() => fetch('https://elsewhere.invalid/').then(() => 'sent', () => 'stopped'));
    expect(outcome).toBe('stopped');
  });
});
