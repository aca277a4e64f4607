import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { Xorshift32 } from '../../hardware-sim/board/xorshift.js';
import { blank, FrameEncoder, SHAPES } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
import {
  CAPABILITY,
  CONFIGURE_FLAG,
  FAULT,
  FIELD_BYTES,
  MAX_FRAME_BYTES,
  MESSAGES,
  type MessageName,
  OUTCOME,
  PROTOCOL_VERSION,
  PULSE_FLAG,
  REASON,
  RESET_CAUSE,
  SYNC_EDGE,
  WIRE_TIMES,
} from '../../server/wire/messages.js';

const PAGE = readFileSync(new URL('../../server/wire/WIRE.md', import.meta.url), 'utf8');

/** The page's text below a heading, up to the next one of any level. */
function section(heading: RegExp): string {
  const found = heading.exec(PAGE);
  if (found === null) throw new Error(`the page has no heading ${heading}`);
  const from = found.index + found[0].length;
  const next = PAGE.slice(from).search(/^#/m);
  return next < 0 ? PAGE.slice(from) : PAGE.slice(from, from + next);
}

/** A table's rows as trimmed cells, without its head. */
function rows(text: string): string[][] {
  return text
    .split('\n')
    .filter((line) => line.startsWith('|'))
    .slice(2)
    .map((line) =>
      line
        .split('|')
        .slice(1, -1)
        .map((cell) => cell.trim()),
    );
}

const names = Object.keys(MESSAGES) as MessageName[];

describe('the wire page', () => {
  test.each(names)('describes every field of %s as the code has it', (name) => {
    const { type, from } = MESSAGES[name];
    const hex = type.toString(16).padStart(2, '0');
    const table = rows(section(new RegExp(`^### ${name} \\(0x${hex}, from the ${from}\\)$`, 'm')));
    const fields = SHAPES[name].fields.map((field) => [
      String(field.offset),
      field.name,
      field.type,
    ]);
    expect(table.map((row) => row.slice(0, 3))).toEqual(fields);
    for (const row of table) expect(row[3]).not.toBe('');
  });

  test('describes no message that the code does not have', () => {
    const described = [...PAGE.matchAll(/^### (\w+) \(0x/gm)].map((found) => found[1]);
    expect(described.sort()).toEqual([...names].sort());
  });

  test.each([
    ['kind of an outcome', OUTCOME],
    ['reason of an outcome', REASON],
    ['fault', FAULT],
    ['reset cause', RESET_CAUSE],
    ['capabilities', CAPABILITY],
    ['flags of configure', CONFIGURE_FLAG],
    ['flags of pulse', PULSE_FLAG],
  ])('lists every %s', (heading, values) => {
    const table = rows(section(new RegExp(`^### ${heading}$`, 'm')));
    expect(table.map(([name, value]) => [name, Number(value)])).toEqual(Object.entries(values));
    for (const row of table) expect(row[2]).not.toBe('');
  });

  test('lists every time that both sides hold to', () => {
    const table = rows(section(/^## Times$/m));
    expect(table.map(([name, value]) => [name, Number(value)])).toEqual(Object.entries(WIRE_TIMES));
  });

  test('states the version, the longest frame and the number of a sync edge', () => {
    expect(PAGE).toContain(`each other, version ${PROTOCOL_VERSION}.`);
    expect(PAGE).toContain(`before stuffing, 6 to ${MAX_FRAME_BYTES} bytes:`);
    expect(PAGE).toContain(`input 0x${SYNC_EDGE.toString(16)} + output`);
    for (const name of names) {
      expect(SHAPES[name].payloadBytes + 6, name).toBeLessThanOrEqual(MAX_FRAME_BYTES);
    }
    expect(Object.keys(FIELD_BYTES)).toEqual(['u8', 'u16', 'u32', 'i32', 'text16']);
  });

  // Source of the first four numbers: G. Marsaglia, Xorshift RNGs, Journal of Statistical Software
  // 8(14), 2003, the generator with shifts 13, 17, 5, begun with 1; the values from memory.
  test('gives the numbers and gaps of the sync train that the generator gives', () => {
    const numbers = new Xorshift32(1);
    const gaps = new Xorshift32(1);
    const first4 = (draw: () => number) => [draw(), draw(), draw(), draw()].join(', ');
    expect(PAGE).toContain(`Seed 1 gives ${first4(() => numbers.next())};`);
    expect(PAGE).toContain(`that is ${first4(() => gaps.between(100_000, 200_000))}.`);
    expect(first4(new Xorshift32(1).next.bind(new Xorshift32(1)))).toBe(
      '270369, 67634689, 2647435461, 307599695',
    );
  });
});

interface Example {
  readonly bytes: Uint8Array;
  readonly says: { message: MessageName; sequence: number; tag: number };
}

const EXAMPLES: Example[] = [
  ...PAGE.matchAll(/```frame\n([0-9a-f\s]+?)\n```\n\n```says\n(.+)\n```/g),
].map((found) => ({
  bytes: Uint8Array.from(found[1]!.split(/\s+/), (byte) => Number.parseInt(byte, 16)),
  says: JSON.parse(found[2]!),
}));

describe("the wire page's examples", () => {
  test('show every message at least once', () => {
    expect(new Set(EXAMPLES.map((example) => example.says.message))).toEqual(new Set(names));
    expect(EXAMPLES.length).toBe([...PAGE.matchAll(/```frame/g)].length);
  });

  test.each(EXAMPLES)('decode to what is written below them ($says.message)', ({ bytes, says }) => {
    const heard: object[] = [];
    const decoder = new FrameDecoder({
      frame(frame) {
        const message = blank(frame.shape.name);
        frame.read(message);
        const { sequence, tag } = frame;
        heard.push({ message: frame.shape.name, sequence, tag, ...message });
      },
      bad(why) {
        throw new Error(why);
      },
    });
    decoder.push(bytes);
    expect(heard).toEqual([says]);
  });

  test.each(EXAMPLES)('are what the encoder makes ($says.message)', ({ bytes, says }) => {
    const encoder = new FrameEncoder();
    for (let n = 0; n < says.sequence; n++) encoder.encode('quiet', { outputs: 0 }, 1);
    const { message, sequence: _, tag, ...fields } = says;
    expect(encoder.encode(message, fields as never, tag)).toEqual(bytes);
  });
});
