import { mkdirSync, renameSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { updateDescription } from '../../../server/session/description.js';
import { lockRecord } from '../../../server/session/record/recordLock.js';
import { SessionIndex } from '../../../server/web/records/sessionIndex.js';
import { describedSession, plainFolder, recordsFolder } from './folders.js';

let root: string;
beforeEach(() => {
  root = recordsFolder();
});
afterEach(() => rmSync(root, { recursive: true, force: true }));

async function looked(index: SessionIndex) {
  await index.look();
  const rows = await index.rows();
  return new Map(rows.map((row) => [row.name, row]));
}

describe('the index of sessions', () => {
  test('tells of each what its description says', async () => {
    describedSession(root, '2026-03-04_09-30-00_m07_Water-at-90');
    const [row] = (await looked(new SessionIndex(root))).values();
    expect(row).toEqual({
      ...{ name: '2026-03-04_09-30-00_m07_Water-at-90', bad: null, subject: 'm07' },
      ...{ title: 'Water at 90', experimenter: 'A. Person', protocolNumber: 'P-12' },
      ...{ sessionNumber: 3, startedAt: '2026-03-04T09:30:00.000+01:00', rules: 'water.yaml' },
      ...{ recording: false, minutes: 20, givenUl: 400, uncertainUl: 0, record: 'whole' },
      ...{ check: 'identical', simulated: false },
      ended: { how: 'rules', at: '2026-03-04T08:50:00.000Z', reason: 'time' },
    });
  });

  test('shows what cannot be read as such, and leaves out what is no session', async () => {
    plainFolder(root, '2026-03-05_10-00-00_m07_a', { 'session.json': '{"format": 1, "name"' });
    plainFolder(root, 'of-tomorrow', { 'session.json': '{"format": 2}' });
    plainFolder(root, 'undescribed', { 'record.mcap': 'bytes' });
    plainFolder(root, 'holiday', { 'photo.txt': 'no session' });
    plainFolder(root, '.making-1', { 'session.json': '{}' });
    describedSession(root, 'wrong-kind', { subject: 7 as unknown as string });
    writeFileSync(join(root, 'notes.txt'), 'no folder');
    const rows = await looked(new SessionIndex(root));
    expect([...rows.keys()].sort()).toEqual([
      ...['2026-03-05_10-00-00_m07_a', 'of-tomorrow', 'undescribed', 'wrong-kind'],
    ]);
    expect(rows.get('2026-03-05_10-00-00_m07_a')).toMatchObject({
      bad: expect.stringMatching(/JSON/),
      startedAt: '2026-03-05T10:00:00',
    });
    expect(rows.get('of-tomorrow')!.bad).toMatch(/session\.json .*must/);
    expect(rows.get('undescribed')!.bad).toBe('session.json is missing');
    expect(rows.get('wrong-kind')!.bad).toBe('session.json at /subject must be string');
  });

  test('reads a description again when it has changed, and no other', async () => {
    const folder = describedSession(root, 'a');
    describedSession(root, 'b');
    const index = new SessionIndex(root);
    const before = await looked(index);
    updateDescription(folder, { title: 'Another title' });
    const after = await looked(index);
    expect(after.get('a')!.title).toBe('Another title');
    // The very same object: it was not read again.
    expect(after.get('b')).toBe(before.get('b'));
    renameSync(join(root, 'b'), join(root, 'c'));
    expect([...(await looked(index)).keys()]).toEqual(['a', 'c']);
  });

  test('says that a session is being recorded for as long as its process lives', async () => {
    const folder = describedSession(root, 'now', { ended: null });
    describedSession(root, 'left', { ended: null });
    lockRecord(folder);
    const index = new SessionIndex(root);
    const rows = await looked(index);
    expect([rows.get('now')!.recording, rows.get('left')!.recording]).toEqual([true, false]);
    // As a process that died left it: no file of the description changes.
    writeFileSync(join(folder, 'recording.lock'), '999999999 1\n');
    expect((await looked(index)).get('now')!.recording).toBe(false);
  });

  test('finds a session by its very name, and never by a path', async () => {
    const outside = recordsFolder();
    describedSession(outside, 'secret');
    describedSession(root, 'a');
    symlinkSync(join(outside, 'secret'), join(root, 'link'));
    mkdirSync(join(root, 'deep'));
    describedSession(join(root, 'deep'), 'below');
    const index = new SessionIndex(root);
    expect((await index.find('a')).folder).toBe(join(root, 'a'));
    const names = [`../${outside.split('/').at(-1)}/secret`, 'link', 'deep/below', './a', 'A', ''];
    for (const name of [...names, join(root, 'a'), 'a\0', '..', '__proto__']) {
      await expect(index.find(name)).rejects.toMatchObject({ code: 'WEB_SESSION_UNKNOWN' });
    }
    rmSync(outside, { recursive: true, force: true });
  });

  test('of a folder that is not there yet is empty', async () => {
    const index = new SessionIndex(join(root, 'later'));
    expect((await looked(index)).size).toBe(0);
    describedSession(join(root, 'later'), 'first');
    expect((await looked(index)).size).toBe(1);
  });
});
