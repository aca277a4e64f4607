import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { parquetMetadata, parquetReadObjects, parquetSchema } from 'hyparquet';
import { readParquet, writeParquet as rewrite, WriterPropertiesBuilder } from 'parquet-wasm/node';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import type { Column } from '../../server/export/table.js';
import { tablesOf } from '../../server/export/tables.js';
import { writeParquet } from '../../server/export/writeParquet.js';
import { recordedSession } from '../analysis/recorded.js';
import { HARD_TEXT } from './hardText.js';

const recorded = recordedSession({ minutes: 2, acts: [{ act: 'note', text: HARD_TEXT }] });
afterAll(() => recorded.remove());
let session: SessionData;
const into = join(recorded.root, 'parquet');
const told: number[] = [];
beforeAll(async () => {
  session = await readSession(recorded.folder);
  writeParquet(session, into, (done) => told.push(done));
});

const bytesOf = (name: string) => readFileSync(join(into, `${name}.parquet`));
const bufferOf = (bytes: Uint8Array) => Uint8Array.from(bytes).buffer;

/** A cell of the table as a Parquet reader must give it back. */
function expected({ type }: Column, cell: string): unknown {
  if (type === 'text') return cell;
  if (cell === '') return null;
  return type === 'yes/no' ? cell === '1' : Number(cell);
}

/** Every row of a table, as `read` finds it. */
async function same(read: (bytes: Buffer) => ArrayBuffer): Promise<number> {
  let rows = 0;
  for (const table of tablesOf(session)) {
    const found = await parquetReadObjects({ file: read(bytesOf(table.name)) });
    const wanted = [...table.rows].map((row) =>
      Object.fromEntries(table.columns.map((c, i) => [c.name, expected(c, row[i]!)])),
    );
    expect(found.length, table.name).toBe(wanted.length);
    expect(found, table.name).toEqual(wanted);
    rows += found.length;
  }
  return rows;
}

describe('the tables as Parquet', { timeout: 120_000 }, () => {
  it('hold every cell of the tables, as hyparquet reads them', async () => {
    expect(await same(bufferOf)).toBeGreaterThan(session.samples.length);
  });

  it("hold them as Apache's Rust reader reads them (parquet-wasm: it reads, writes anew, compared)", async () => {
    await same((bytes) => {
      const plain = new WriterPropertiesBuilder().setDictionaryEnabled(false).build();
      return bufferOf(rewrite(readParquet(bytes), plain));
    });
  });

  it('say in their metadata what each column is, and of which session', () => {
    for (const { name, columns, meaning } of tablesOf(session)) {
      const metadata = parquetMetadata(bufferOf(bytesOf(name)));
      const about = new Map(metadata.key_value_metadata!.map(({ key, value }) => [key, value]));
      expect(about.get('lapwing.session')).toBe(session.description.name);
      expect(about.get('lapwing.table')).toBe(name);
      expect(about.get('lapwing.meaning')).toBe(meaning);
      expect(JSON.parse(about.get('lapwing.columns')!)).toEqual(columns);
      const types = { number: 'DOUBLE', integer: 'INT32', 'yes/no': 'BOOLEAN', text: 'BYTE_ARRAY' };
      expect(parquetSchema(metadata).children.map(({ element }) => element.type)).toEqual(
        columns.map(({ type }) => types[type]),
      );
    }
  });

  it('are the same bytes when written twice, and no file more', () => {
    const again = writeParquet(session, join(recorded.root, 'again'));
    const names = readdirSync(into).sort();
    expect(readdirSync(again).sort()).toEqual(names);
    expect(names).toEqual(
      [
        ...tablesOf(session).map(({ name }) => `${name}.parquet`),
        'README.txt',
        'dictionary.csv',
      ].sort(),
    );
    for (const name of names)
      expect(readFileSync(join(again, name)).equals(readFileSync(join(into, name))), name).toBe(
        true,
      );
  });

  it('keep a text with quotes, commas, line breaks and other scripts', async () => {
    const rows = await parquetReadObjects({ file: bufferOf(bytesOf('decisions')) });
    expect(rows.filter(({ kind }) => kind === 'note').map(({ detail }) => detail)).toContain(
      HARD_TEXT,
    );
  });

  it('say how far they are, from the first group to the last', () => {
    expect(told.length).toBeGreaterThan(3);
    expect(told.every((done) => done > 0 && done <= 1)).toBe(true);
    expect(told.at(-1)).toBe(1);
  });
});
