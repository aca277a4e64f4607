import fs from 'node:fs';
import { McapStreamReader, type McapTypes } from '@mcap/core';

/** Every record of the file, by the library's own reader with CRCs checked. */
export function publicRead(file: string): { records: McapTypes.TypedMcapRecord[]; done: boolean } {
  const reader = new McapStreamReader({ validateCrcs: true });
  reader.append(fs.readFileSync(file));
  const records: McapTypes.TypedMcapRecord[] = [];
  // All bytes are there at once, so what a record points into is not moved by more of them.
  for (let next = reader.nextRecord(); next !== undefined; next = reader.nextRecord())
    records.push(next);
  return { records, done: reader.done() };
}
