// Serves the built page: `node pkg-scripts/serve.mjs [FOLDER] [PORT]`. Takes the first free port from PORT on.
import { readFile } from 'node:fs/promises';
import { createServer } from 'node:http';
import { extname, join, normalize, resolve, sep } from 'node:path';
import { pathToFileURL } from 'node:url';
import { promisify } from 'node:util';
import { brotliCompress, constants } from 'node:zlib';

const types = {
  '.css': 'text/css',
  '.csv': 'text/csv; charset=utf-8',
  '.html': 'text/html; charset=utf-8',
  '.jpg': 'image/jpeg',
  '.js': 'text/javascript',
  '.json': 'application/json',
  '.onnx': 'application/octet-stream',
  '.svg': 'image/svg+xml',
  '.wasm': 'application/wasm',
  '.webmanifest': 'application/manifest+json',
};
const compress = promisify(brotliCompress);

/** Resolves to the server and its address once it listens. */
export async function serve(folder, firstPort) {
  const root = resolve(folder);
  const page = await readFile(join(root, 'index.html'), 'utf8');
  // The page carries its policy; the header repeats it, so that it also holds for workers.
  const policy = /http-equiv="Content-Security-Policy" content="([^"]+)"/.exec(page)?.[1] ?? "default-src 'self'";
  const compressed = new Map();

  async function body(file, accepts) {
    const plain = await readFile(file);
    if (extname(file) === '.jpg' || !/\bbr\b/.test(accepts ?? '')) return { bytes: plain, encoding: undefined };
    if (!compressed.has(file)) {
      const level = { params: { [constants.BROTLI_PARAM_QUALITY]: 6 } };
      compressed.set(file, compress(plain, level));
    }
    return { bytes: await compressed.get(file), encoding: 'br' };
  }

  const server = createServer(async (request, response) => {
    const path = normalize(decodeURIComponent(new URL(request.url ?? '/', 'http://localhost').pathname));
    const file = join(root, path.endsWith(sep) ? join(path, 'index.html') : path);
    response.setHeader('Content-Security-Policy', policy.replaceAll('&#39;', "'"));
    response.setHeader('X-Content-Type-Options', 'nosniff');
    response.setHeader('Referrer-Policy', 'no-referrer');
    try {
      if (!file.startsWith(root + sep)) throw new Error('outside the folder');
      const { bytes, encoding } = await body(file, request.headers['accept-encoding']);
      response.setHeader('Content-Type', types[extname(file)] ?? 'application/octet-stream');
      // Names with a hash never change their content; the others are asked for again.
      response.setHeader('Cache-Control', path.includes(`${sep}assets${sep}`) ? 'max-age=31536000, immutable' : 'no-cache');
      if (encoding) response.setHeader('Content-Encoding', encoding);
      response.setHeader('Content-Length', bytes.length);
      response.end(request.method === 'HEAD' ? undefined : bytes);
    } catch {
      response.statusCode = 404;
      response.end('Not found\n');
    }
  });

  for (let port = firstPort; port < firstPort + 50; port++) {
    const free = await new Promise((settle) => {
      server.once('error', () => settle(false));
      server.listen(port, '127.0.0.1', () => settle(true));
    });
    if (free) return { server, address: `http://localhost:${port}/` };
    server.removeAllListeners('error');
    server.removeAllListeners('listening');
  }
  throw new Error(`no free port from ${firstPort} to ${firstPort + 49}`);
}

if (process.argv[1] && import.meta.url === pathToFileURL(process.argv[1]).href) {
  const { address } = await serve(process.argv[2] ?? 'www/app/dist', Number(process.argv[3] ?? 4180));
  console.log(`\nKenspeckle is at  ${address}\n(Ctrl-C stops it. Nothing leaves this machine.)\n`);
}
