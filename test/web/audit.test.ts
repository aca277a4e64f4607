import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { auditPackages } from '../tools/auditPackages.mjs';

/** As npm 10 writes it with `--json`. */
const report = (high: number) => ({
  auditReportVersion: 2,
  vulnerabilities: high > 0 ? { hollow: { name: 'hollow', severity: 'high' } } : {},
  metadata: {
    vulnerabilities: { info: 0, low: 1, moderate: 0, high, critical: 0, total: 1 + high },
  },
});
const answering = (status: number, body: unknown) => () => ({
  status,
  stdout: typeof body === 'string' ? body : JSON.stringify(body),
});

describe('the audit of the packages that ship', () => {
  test('fails on a known hole of level high, and names the package', () => {
    expect(auditPackages('.', answering(1, report(1)))).toEqual({
      good: false,
      words: 'npm audit of what ships: 1 low, 1 high (hollow)',
    });
  });

  test('passes on what is less, and says so', () => {
    expect(auditPackages('.', answering(0, report(0)))).toMatchObject({ good: true });
  });

  test('is no failure where the registry does not answer, and says why', () => {
    const refused = { message: '405 Method Not Allowed', error: { summary: '' } };
    const { good, words } = auditPackages('.', answering(1, refused));
    expect([good, words]).toEqual([true, expect.stringContaining('405 Method Not Allowed')]);
    expect(auditPackages('.', answering(1, '')).good).toBe(true);
  });

  test('is a step of the whole test run, which CI runs', () => {
    const run = readFileSync(new URL('../tools/test.mjs', import.meta.url), 'utf8');
    expect(run).toMatch(/^ +if \(filters\.length === 0\) auditStep\(\);$/m);
    expect(readFileSync(new URL('../../.ci/run', import.meta.url), 'utf8')).toContain(
      'test/tools/test.mjs',
    );
  });
});
