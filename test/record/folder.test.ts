import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  describeBoard,
  readDescription,
  rfc3339,
  type SessionDescription,
  sessionSchemaFile,
  updateDescription,
  writeDescription,
} from '../../server/session/description.js';
import {
  createSessionFolder,
  sessionFolderName,
  storeInputFiles,
} from '../../server/session/folder.js';
import { diskFree, whyNotLocal } from '../../server/session/localDisk.js';
import { safeName } from '../../server/session/safeName.js';
import { nextSessionNumber } from '../../server/session/store.js';
import { writeFileWhole } from '../../server/session/writeFileWhole.js';
import { identity } from './identity.js';
import { temporaryFolder } from './sessions.js';

const startedAt = new Date(2026, 11, 1, 14, 3, 22);
const anyText = fc.oneof(
  fc.string({ unit: 'binary' }),
  fc.string({ unit: 'grapheme' }),
  fc.constantFrom(
    '../../etc/passwd',
    '..',
    '.',
    '',
    '/abs/olute',
    'C:\\Windows\\x',
    '\\\\server\\share',
    'CON',
    'nul.txt',
    'LPT1',
    'a\0b',
    'a\nb',
    '-rf',
    '~',
    '$(id)',
    'm31 ',
    'm31.',
    'x'.repeat(5000),
    '\u202Egnp.exe',
  ),
);

describe('a session folder', () => {
  it('is named by time, subject and title', () => {
    const name = sessionFolderName({ subject: 'm31', title: 'Induction, sham laps', startedAt });
    expect(name).toBe('2026-12-01_14-03-22_m31_Induction-sham-laps');
  });

  it('keeps an accented name readable', () => {
    expect(safeName('Zoë Müller', 40, 'subject')).toBe('Zoe-Muller');
  });

  it('stays one folder directly below its root, whatever the subject and the title are', () => {
    const root = temporaryFolder();
    fc.assert(
      fc.property(anyText, anyText, (subject, title) => {
        const folder = createSessionFolder(root, { subject, title, startedAt });
        expect(path.dirname(folder)).toBe(root);
        expect(path.basename(folder)).toMatch(/^2026-12-01_14-03-22_[\w.-]+_[\w.-]*\w$/);
        expect(path.basename(folder).length).toBeLessThan(120);
        expect(fs.readdirSync(folder)).toEqual([]);
      }),
      { seed: 41, numRuns: 100 },
    );
  });

  it('has no part that Windows keeps for a device or would cut short', () => {
    fc.assert(
      fc.property(anyText, (words) => {
        const name = safeName(words, 40, 'subject');
        expect(name).toMatch(/^[A-Za-z0-9._-]+$/);
        expect(name).not.toMatch(/^(con|prn|aux|nul|com\d|lpt\d)(\.|$)/i);
        expect(name).not.toMatch(/^[.-]|[.]$|\.\./);
      }),
      { seed: 42, numRuns: 300 },
    );
  });

  it('is never one that was there: a second session in the same second gets a number', () => {
    const root = temporaryFolder();
    const about = { subject: 'm31', title: 'Test', startedAt };
    const first = createSessionFolder(root, about);
    fs.writeFileSync(path.join(first, 'record.mcap'), 'kept');
    const names = [1, 2].map(() => path.basename(createSessionFolder(root, about)));
    expect(names).toEqual([path.basename(first) + '_2', path.basename(first) + '_3']);
    expect(fs.readFileSync(path.join(first, 'record.mcap'), 'utf8')).toBe('kept');
  });

  it('says why it could not be made', () => {
    const root = path.join(temporaryFolder(), 'a file');
    fs.writeFileSync(root, '');
    expect(() => createSessionFolder(root, { subject: 'a', title: 'b', startedAt })).toThrow(
      expect.objectContaining({ code: 'RECORD_FOLDER_BAD' }),
    );
  });
});

describe('copies of what a session was run from', () => {
  it('are exact, byte for byte, with their hashes', () => {
    const folder = temporaryFolder();
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 300 }), (content) => {
        const [stored] = storeInputFiles(folder, [{ role: 'rig', source: 'my rig.yml', content }]);
        expect([...fs.readFileSync(path.join(folder, 'rig.yaml'))]).toEqual([...content]);
        const sha256 = createHash('sha256').update(content).digest('hex');
        const bytes = content.length;
        expect(stored).toEqual({
          role: 'rig',
          stored: 'rig.yaml',
          source: 'my rig.yml',
          bytes,
          sha256,
        });
      }),
      { seed: 43, numRuns: 20 },
    );
  });

  it('keep the paths the rules file gives them, so that the copy runs as it stands', () => {
    const folder = temporaryFolder();
    const content = Buffer.from('lap,kind\n');
    const stored = storeInputFiles(folder, [
      { role: 'rules', source: 'x.yaml', content },
      { role: 'included', source: 'tables/laps.csv', content },
      { role: 'included', source: './common.yaml', content },
    ]);
    expect(stored.map((file) => file.stored)).toEqual([
      'rules.yaml',
      'tables/laps.csv',
      'common.yaml',
    ]);
    expect(fs.readFileSync(path.join(folder, 'tables', 'laps.csv')).equals(content)).toBe(true);
  });

  it('never leave the folder, take the place of another, or of a file of the session', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.oneof(
            anyText,
            fc.constantFrom(
              'record.mcap',
              'session.json',
              'rules.yaml',
              'RIG.yaml',
              'a',
              'A',
              'a/b',
              'a/b/c',
            ),
          ),
          { maxLength: 12 },
        ),
        (sources) => {
          const folder = temporaryFolder();
          const files = sources.map((source, i) => ({
            role: 'included' as const,
            source,
            content: Buffer.from(String(i)),
          }));
          const stored = storeInputFiles(folder, files).map((file) => file.stored);
          expect(new Set(stored.map((one) => one.toLowerCase())).size).toBe(files.length);
          stored.forEach((place, i) => {
            const file = path.resolve(folder, place);
            expect(path.relative(folder, file)).not.toMatch(/^\.\.|^$/);
            expect(fs.readFileSync(file, 'utf8')).toBe(String(i));
            expect(place).not.toMatch(/^(record|session\.json|rules\.yaml|rig\.yaml)/i);
          });
          fs.rmSync(folder, { recursive: true });
        },
      ),
      { seed: 44, numRuns: 40 },
    );
  });
});

const DESCRIPTION: SessionDescription = {
  format: 1,
  name: '2026-12-01_14-03-22_m31_Test',
  subject: 'm31 "hostile" \u202E/..',
  experimenter: null,
  protocolNumber: 'P-2026-014',
  sessionNumber: 12,
  title: 'Test',
  startedAt: rfc3339(startedAt),
  software: { name: 'lapwing', version: '0.1.0', node: process.version, platform: 'linux' },
  board: describeBoard(identity),
  seed: 'a1b2',
  calibrations: [
    {
      of: 'valve water',
      madeAt: '2026-11-30T09:00:00+01:00',
      values: { usPerNl: 9.5, deadUs: 2000 },
    },
  ],
  files: [
    { role: 'rig', stored: 'rig.yaml', source: 'rig.yaml', bytes: 0, sha256: 'ab'.repeat(32) },
  ],
  ended: null,
};

describe('session.json', () => {
  const valid = new Ajv2020({ strict: true, allowUnionTypes: true }).compile(
    JSON.parse(fs.readFileSync(sessionSchemaFile(), 'utf8')) as object,
  );

  it('is what its schema says, at the start and when the session has ended', () => {
    const folder = temporaryFolder();
    writeDescription(folder, DESCRIPTION);
    const read = () =>
      JSON.parse(fs.readFileSync(path.join(folder, 'session.json'), 'utf8')) as unknown;
    expect(valid(read()), JSON.stringify(valid.errors)).toBe(true);
    expect(readDescription(folder)).toEqual(DESCRIPTION);
    const ended = { how: 'rules', at: rfc3339(new Date()), reason: 'time >= 60 min' } as const;
    const record = { state: 'whole', messages: 9, lastInput: 3, bytes: 100, missing: [] } as const;
    updateDescription(folder, { ended, record });
    expect(valid(read()), JSON.stringify(valid.errors)).toBe(true);
    expect(readDescription(folder)).toEqual({ ...DESCRIPTION, ended, record });
  });

  it('lacks no field that its schema wants', () => {
    for (const field of Object.keys(DESCRIPTION)) {
      const less: Record<string, unknown> = { ...DESCRIPTION };
      delete less[field];
      expect(valid(less), field).toBe(false);
    }
  });

  it('gives the start as RFC 3339 with the zone, to the millisecond', () => {
    // RFC 3339 section 5.6: date-time.
    expect(DESCRIPTION.startedAt).toMatch(/^2026-12-01T14:03:22\.000(\+|-)\d\d:\d\d$/);
    expect(Date.parse(DESCRIPTION.startedAt)).toBe(startedAt.getTime());
  });

  it('that is missing, broken or of another format has its own code', () => {
    const folder = temporaryFolder();
    const bad = expect.objectContaining({ code: 'RECORD_DESCRIPTION_BAD' });
    expect(() => readDescription(folder)).toThrow(bad);
    for (const text of ['{', '[]', 'null', '{"format":2}']) {
      fs.writeFileSync(path.join(folder, 'session.json'), text);
      expect(() => readDescription(folder)).toThrow(bad);
    }
  });

  it('is replaced whole or not at all', () => {
    const folder = temporaryFolder();
    writeDescription(folder, DESCRIPTION);
    // Nothing can be renamed onto a folder that is not empty: the last step fails.
    const blocked = path.join(folder, 'blocked');
    fs.mkdirSync(path.join(blocked, 'x'), { recursive: true });
    expect(() => writeFileWhole(blocked, 'text')).toThrow();
    expect(fs.readdirSync(folder).sort()).toEqual(['blocked', 'session.json']);
    expect(readDescription(folder)).toEqual(DESCRIPTION);
  });
});

describe("a subject's sessions", () => {
  it('are counted on from its last one, and from no other animal', () => {
    const root = temporaryFolder();
    const record = (subject: string, sessionNumber: number | null, day: number) => {
      const name = { subject, title: 'Test', startedAt: new Date(2026, 2, day, 9) };
      const folder = createSessionFolder(root, name);
      writeDescription(folder, { ...DESCRIPTION, subject, sessionNumber });
      return folder;
    };
    expect(nextSessionNumber(path.join(root, 'none yet'), 'm31')).toBe(1);
    record('m31', 1, 1);
    // Its name is the same in a folder's, and it is another animal.
    record('m 31', 70, 2);
    record('m-31', 80, 2);
    expect(nextSessionNumber(root, 'm31')).toBe(2);
    expect(nextSessionNumber(root, 'm 31')).toBe(71);
    // The lab counts as it likes; sessions without a number and torn descriptions do no harm.
    record('m31', 14, 3);
    record('m31', null, 4);
    fs.writeFileSync(path.join(record('m31', 90, 5), 'session.json'), '{');
    expect(nextSessionNumber(root, 'm31')).toBe(16);
  });
});

describe('where a session may be recorded live', () => {
  it('a disk of this computer is right', () => {
    expect(whyNotLocal(temporaryFolder())).toBeUndefined();
    expect(diskFree(temporaryFolder())).toBeGreaterThan(0);
  });

  it('a network file system is refused, by its number in statfs(2)', () => {
    const folder = temporaryFolder();
    for (const [type, name] of [
      [0x6969, 'NFS'],
      [0xff534d42, 'CIFS'],
      // As a signed 32-bit number, which some systems give.
      [0xff534d42 - 2 ** 32, 'CIFS'],
      [0xfe534d42, 'SMB'],
      [0x65735546, 'FUSE'],
    ] as const)
      expect(whyNotLocal(folder, () => type)).toContain(name);
    // linux/magic.h: ext4, XFS, Btrfs, tmpfs.
    for (const type of [0xef53, 0x58465342, 0x9123683e, 0x01021994])
      expect(whyNotLocal(folder, () => type)).toBeUndefined();
  });

  it('a folder that a program synchronises is refused, with what gave it away', () => {
    for (const mark of ['.sync', '.synced', '.sync_1f2e.db', '.~sync.lst'])
      expect(marked(mark)).toContain(mark);
    for (const harmless of ['.rsync-filter', 'sync', '.hidden', 'frame-sync'])
      expect(marked(harmless)).toBeUndefined();
    const top = temporaryFolder();
    fs.writeFileSync(path.join(top, '.synced'), '');
    const root = path.join(top, 'lab', 'sessions');
    const about = { subject: 'm31', title: 'Test', startedAt };
    expect(() => createSessionFolder(root, about)).toThrow(
      expect.objectContaining({ code: 'RECORD_FOLDER_REMOTE' }),
    );
    // A rehearsal may be written there.
    expect(fs.existsSync(createSessionFolder(root, about, { live: false }))).toBe(true);
  });

  function marked(name: string): string | undefined {
    const folder = temporaryFolder();
    fs.writeFileSync(path.join(folder, name), '');
    fs.mkdirSync(path.join(folder, 'sessions'));
    return whyNotLocal(path.join(folder, 'sessions'));
  }
});
