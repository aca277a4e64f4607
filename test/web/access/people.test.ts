import { chmodSync, existsSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { dirname } from 'node:path';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Attempts } from '../../../server/web/access/attempts.js';
import { cookieFor, cookieIn, cookieName } from '../../../server/web/access/cookies.js';
import { accessFiles, People } from '../../../server/web/access/people.js';
import { COST, hashSecret, isSecret, newSecret } from '../../../server/web/access/secrets.js';
import { CHEAP, newFiles } from './signedIn.js';

describe('a secret', () => {
  test('is scrypt of RFC 7914, test vector 2 (from memory)', async () => {
    const salt = Buffer.from('NaCl');
    const { hash } = await hashSecret('password', salt, { n: 1024, r: 8, p: 16 });
    // The first 32 of the vector's 64 bytes: PBKDF2 makes its output block by block.
    expect(Buffer.from(hash, 'base64url').toString('hex')).toBe(
      'fdbabe1c9d3472007856e7190d01e9fe7c6ad7cbc8237830e77376634b373162',
    );
  });

  test('is hashed at the cost of the OWASP Password Storage Cheat Sheet', async () => {
    // From memory: N = 2^15, r = 8, p = 3 is one of its equivalent settings for scrypt.
    expect(COST).toEqual({ n: 32_768, r: 8, p: 3 });
    const secret = newSecret();
    const kept = await hashSecret(secret, Buffer.alloc(16, 7));
    expect(await isSecret(secret, kept)).toBe(true);
    expect(await isSecret(`${secret}2`, kept)).toBe(false);
  });

  test('is 20 letters, none of which looks like another, and never the same', () => {
    const many = Array.from({ length: 500 }, newSecret);
    for (const secret of many)
      expect(secret).toMatch(/^(?:[2-9a-hjkmnp-z]{4}-){4}[2-9a-hjkmnp-z]{4}$/);
    expect(new Set(many).size).toBe(500);
    const letters = new Set(many.join('').replaceAll('-', ''));
    expect(letters.size).toBe(31);
  });
});

describe('the people of a rig', () => {
  test('are kept with a hash and no secret, in a file and a folder that nobody else reads', async () => {
    const { peopleFile } = newFiles();
    const people = new People(peopleFile, CHEAP);
    const secret = await people.add('anna', 'operator');
    const text = readFileSync(peopleFile, 'utf8');
    expect(text).toContain('anna');
    for (const part of secret.split('-')) expect(text).not.toContain(part);
    expect(statSync(peopleFile).mode & 0o777).toBe(0o600);
    expect(statSync(dirname(peopleFile)).mode & 0o777).toBe(0o700);
    expect(new People(peopleFile, CHEAP).all).toEqual(people.all);
  });

  test('keep other hashes for the same secret, by a salt of their own', async () => {
    const people = new People(newFiles().peopleFile, CHEAP);
    await people.add('anna', 'operator');
    await people.add('ben', 'operator');
    const [anna, ben] = people.all.map(({ secret }) => secret.salt);
    expect(anna).not.toBe(ben);
  });

  test('may have names of any script, and no name twice or with what a header could not carry', async () => {
    const people = new People(newFiles().peopleFile, CHEAP);
    for (const name of ['Zoë', '莉', 'rig.2_b-c']) await people.add(name, 'viewer');
    // The same letters, composed the other way.
    await expect(people.add('Zoe\u0308', 'viewer')).rejects.toMatchObject({ code: 'WEB_PERSON' });
    for (const name of ['', ' ', 'a b', '1st', 'a\n', 'a"', '../x', 'x'.repeat(33)]) {
      await expect(people.add(name, 'viewer')).rejects.toMatchObject({ code: 'WEB_PERSON' });
    }
    expect(() => people.remove('nobody')).toThrow(/Zoë, 莉/);
    await expect(people.renew('nobody')).rejects.toMatchObject({ code: 'WEB_PERSON' });
  });

  test('added from two places are all kept', async () => {
    const { peopleFile } = newFiles();
    const [one, two] = [new People(peopleFile, CHEAP), new People(peopleFile, CHEAP)];
    await Promise.all([one.add('anna', 'operator'), two.add('ben', 'viewer')]);
    const names = new People(peopleFile, CHEAP).all.map(({ name }) => name);
    expect(names.sort()).toEqual(['anna', 'ben']);
  });

  test('are not read from a file that others may read, or that is damaged', async () => {
    const { peopleFile } = newFiles();
    await new People(peopleFile, CHEAP).add('anna', 'operator');
    chmodSync(peopleFile, 0o640);
    expect(() => new People(peopleFile)).toThrow(/others than its owner/);
    chmodSync(peopleFile, 0o600);
    const whole = readFileSync(peopleFile, 'utf8');
    const wrong = [
      '',
      '{',
      'null',
      '[]',
      '{"format":2,"people":[]}',
      whole.replace('operator', 'king'),
    ];
    for (const text of wrong) {
      writeFileSync(peopleFile, text);
      expect(() => new People(peopleFile), text).toThrow(
        expect.objectContaining({ code: 'WEB_PEOPLE_FILE' }),
      );
    }
  });

  test('of each rig are in a folder of their own, whatever the rig is called', () => {
    const names = ['demo', 'Demo', '../../etc', 'a/b', 'a b', ''];
    const files = names.map((name) => accessFiles(name).peopleFile);
    expect(new Set(files).size).toBe(names.length);
    for (const file of files) {
      expect(file).not.toContain('..');
      expect(existsSync(file)).toBe(false);
    }
  });
});

describe('attempts to sign in', () => {
  function clocked() {
    let nowMs = 0;
    const attempts = new Attempts(() => nowMs);
    return { attempts, pass: (ms: number) => (nowMs += ms) };
  }

  test('wait twice as long after each failure, up to five minutes, and not after an hour', () => {
    const { attempts, pass } = clocked();
    const waits = Array.from({ length: 14 }, () => {
      attempts.failed('anna', '10.0.0.7');
      const waitMs = attempts.waitMs('anna', '10.0.0.7');
      pass(waitMs);
      return waitMs / 1000;
    });
    expect(waits).toEqual([0, 0, 1, 2, 4, 8, 16, 32, 64, 128, 256, 300, 300, 300]);
    expect(attempts.waitMs('anna', '10.0.0.7')).toBe(0);
    pass(3_600_001);
    attempts.failed('anna', '10.0.0.7');
    expect(attempts.waitMs('anna', '10.0.0.7')).toBe(0);
  });

  test('with many names from one address make that address wait, and no other', () => {
    const { attempts } = clocked();
    for (let n = 0; n < 12; n++) attempts.failed(`name-${n}`, '10.0.0.7');
    expect(attempts.waitMs('anna', '10.0.0.7')).toBeGreaterThan(0);
    expect(attempts.waitMs('anna', '10.0.0.8')).toBe(0);
  });

  test('from a thousand addresses are a hundred an hour for one name, and its owner still gets in', () => {
    const { attempts, pass } = clocked();
    attempts.succeeded('anna', '10.0.0.7');
    let tried = 0;
    for (let n = 0; n < 1000; n++) {
      pass(1000);
      const address = `10.1.${n >> 8}.${n & 255}`;
      if (attempts.waitMs('anna', address) > 0) continue;
      tried++;
      attempts.failed('anna', address);
    }
    expect(tried).toBe(100);
    expect(attempts.waitMs('anna', '10.9.9.9')).toBeGreaterThan(0);
    expect(attempts.waitMs('anna', '10.0.0.7')).toBe(0);
    expect(attempts.waitMs('ben', '10.9.9.9')).toBe(0);
    pass(3_600_000);
    expect(attempts.waitMs('anna', '10.9.9.9')).toBe(0);
  });

  test('never let one name at one address try more than a few dozen times an hour', () => {
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 0, max: 20_000 }), { maxLength: 400 }), (gaps) => {
        const { attempts, pass } = clocked();
        let spentMs = 0;
        let tries = 0;
        for (const gap of gaps) {
          pass(gap);
          spentMs += gap;
          if (spentMs > 3_600_000) break;
          if (attempts.waitMs('anna', 'a') > 0) continue;
          tries++;
          attempts.failed('anna', 'a');
        }
        // 3 free, 8 while the wait doubles to 256 s, then one in 300 s.
        expect(tries).toBeLessThanOrEqual(3 + 9 + 12);
      }),
      { seed: 6, numRuns: 200 },
    );
  });
});

describe('the cookie', () => {
  test('carries over TLS the prefix that only a secure answer for this very host may set', () => {
    // RFC 6265bis, 4.1.3.2: `__Host-` wants Secure, Path=/ and no Domain.
    const cookie = cookieFor(cookieName('abc', true), 'v', 60, true);
    expect(cookie).toBe(
      '__Host-lapwing-abc=v; Path=/; HttpOnly; SameSite=Strict; Max-Age=60; Secure',
    );
  });

  test('is found among others, whatever they are called', () => {
    fc.assert(
      fc.property(
        fc.array(fc.stringMatching(/^[a-z_-]{1,12}=[\w-]{0,12}$/)),
        fc.nat(),
        (others, at) => {
          const rest = others.filter((one) => !one.startsWith('lapwing-k='));
          const all = rest.toSpliced(at % (rest.length + 1), 0, 'lapwing-k=value');
          expect(cookieIn(all.join('; '), 'lapwing-k')).toBe('value');
          expect(cookieIn(rest.join('; '), 'lapwing-k')).toBeUndefined();
        },
      ),
      { seed: 6 },
    );
  });
});
