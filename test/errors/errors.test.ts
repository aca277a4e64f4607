import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { ERRORS } from '../../server/errors/codes.js';
import { errorsPage } from '../../server/errors/errorsPage.js';
import { packageRoot } from '../../server/packageRoot.js';

const page = readFileSync(join(packageRoot, 'server/errors/ERRORS.md'), 'utf8');
const codes = Object.values(ERRORS).map(({ code }) => code);

/** All of the program's own source text. */
function source(): string {
  const folders = ['server', 'dashboard', 'hardware-sim'];
  return folders
    .flatMap((folder) =>
      readdirSync(join(packageRoot, folder), { recursive: true, withFileTypes: true })
        .filter((entry) => entry.isFile() && /\.tsx?$/.test(entry.name))
        .filter((entry) => entry.name !== 'codes.ts')
        .map((entry) => readFileSync(join(entry.parentPath, entry.name), 'utf8')),
    )
    .join('\n');
}

describe('the table of error codes', () => {
  it('has every code once', () => {
    expect(new Set(codes).size).toBe(codes.length);
  });

  it('names an entry in code as it names it to users', () => {
    for (const [name, { code }] of Object.entries(ERRORS)) {
      expect(name.replace(/[A-Z]/g, (letter) => `_${letter}`).toUpperCase()).toBe(code);
    }
  });

  it('has each of its codes on the page, and the page has no other', () => {
    const onPage = [...page.matchAll(/^### (\w+)$/gm)].map(([, code]) => code);
    expect(onPage.sort()).toEqual([...codes].sort());
  });

  it('says on the page what it says to users (`npm run pages` makes it anew)', () => {
    expect(page).toBe(errorsPage());
  });

  it('gives every error a remedy', () => {
    for (const entry of Object.values(ERRORS)) expect(entry.remedy, entry.code).not.toBe('');
  });

  it('holds no code that nothing uses', () => {
    const text = source();
    const unused = Object.keys(ERRORS).filter((name) => !text.includes(`'${name}'`));
    expect(unused).toEqual([]);
  });
});
