import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { root } from './fixtures';

const source = readFileSync(join(root, 'www/kit/core.ts'), 'utf8');

/** What the page's code says of the text encoder, read off its source: the module itself only loads in a bundle. */
export const bundledText = {
  textIdentity: /textIdentity: '([^']+)'/.exec(source)?.[1],
  textEncoderBytes: Number(/textEncoderBytes: ([\d_]+)/.exec(source)?.[1]?.replaceAll('_', '')),
};
