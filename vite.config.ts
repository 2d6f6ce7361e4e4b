import { createReadStream, existsSync, readdirSync, readFileSync } from 'node:fs';
import { join, resolve } from 'node:path';
import { defineConfig, type Plugin } from 'vite';
import { VitePWA } from 'vite-plugin-pwa';

const csp = [
  "default-src 'self'",
  "script-src 'self' 'wasm-unsafe-eval'",
  "style-src 'self'",
  "img-src 'self' blob: data:",
  "worker-src 'self'",
  "object-src 'none'",
  "base-uri 'none'",
  "form-action 'none'",
].join('; ');

const headers = {
  'Content-Security-Policy': csp,
  'X-Content-Type-Options': 'nosniff',
  'Referrer-Policy': 'no-referrer',
};

/** The policy travels with the page, whatever server it is put on. */
const cspInPage: Plugin = {
  name: 'csp-in-page',
  apply: 'build',
  transformIndexHtml: () => [
    { tag: 'meta', attrs: { 'http-equiv': 'Content-Security-Policy', content: csp }, injectTo: 'head-prepend' },
  ],
};

const pile = resolve(import.meta.dirname, 'www/demo/pile');
const log = resolve(import.meta.dirname, 'www/demo/notes/log.csv');

/** The demo piles are not kept in the page's folder: served from where they lie, copied when built. */
const demoPile: Plugin = {
  name: 'demo-pile',
  configureServer(server) {
    server.middlewares.use('/demo/notes/log.csv', (_request, response) => {
      response.setHeader('Content-Type', 'text/csv; charset=utf-8');
      createReadStream(log).pipe(response);
    });
    server.middlewares.use('/demo/pile', (request, response, next) => {
      const name = decodeURIComponent((request.url ?? '').split('?')[0] ?? '').slice(1);
      const file = join(pile, name);
      if (!/^[\w.-]+$/.test(name) || !existsSync(file)) return next();
      response.setHeader('Content-Type', name.endsWith('.json') ? 'application/json' : 'image/jpeg');
      createReadStream(file).pipe(response);
    });
  },
  generateBundle() {
    this.emitFile({ type: 'asset', fileName: 'demo/notes/log.csv', source: readFileSync(log) });
    if (!existsSync(pile)) return;
    for (const name of readdirSync(pile).filter((name) => !name.startsWith('.'))) {
      this.emitFile({ type: 'asset', fileName: `demo/pile/${name}`, source: readFileSync(join(pile, name)) });
    }
  },
};

export default defineConfig({
  root: 'www/app',
  base: './',
  build: { outDir: 'dist', emptyOutDir: true, target: 'es2022', assetsInlineLimit: 0, modulePreload: { polyfill: false } },
  worker: { format: 'es' },
  server: { port: 4180, headers, fs: { allow: ['../..'] } },
  preview: { port: 4180, headers },
  plugins: [
    cspInPage,
    demoPile,
    VitePWA({
      injectRegister: null,
      registerType: 'autoUpdate',
      includeAssets: [],
      manifest: {
        name: 'Kenspeckle',
        short_name: 'Kenspeckle',
        description: 'Sort a pile of photos or notes into your own trays from a handful of answers. Nothing leaves the device.',
        theme_color: '#e7ece8',
        background_color: '#e7ece8',
        display: 'standalone',
        start_url: './',
        icons: [{ src: 'icon.svg', sizes: 'any', type: 'image/svg+xml', purpose: 'any' }],
      },
      workbox: {
        globPatterns: ['**/*.{html,js,css,wasm,onnx,svg}'],
        // The page keeps the text encoder itself once the first note has fetched it; who sorts photos never does.
        globIgnores: ['**/text-*.onnx'],
        maximumFileSizeToCacheInBytes: 16 * 1024 * 1024,
        cleanupOutdatedCaches: true,
        clientsClaim: true,
        // The first opening of the demo keeps it for the next one without a network.
        runtimeCaching: [
          {
            urlPattern: ({ url, sameOrigin }) => sameOrigin && /\/demo\/(pile|notes)\//.test(url.pathname),
            handler: 'StaleWhileRevalidate',
            options: { cacheName: 'demo-pile' },
          },
        ],
      },
    }),
  ],
});
