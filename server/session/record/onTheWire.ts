import { SHAPES } from '../../wire/codec.js';
import { FIELD_BYTES, type HostMessageName } from '../../wire/messages.js';

/**
 * A command as the wire carries it: fields in the wire's order, each number as its width leaves it.
 * The host reckons in extended time, so what it passes on may be longer.
 */
export function onTheWire(name: HostMessageName, message: object): Record<string, number> {
  const fields: Record<string, number> = {};
  for (const { name: field, type } of SHAPES[name].fields) {
    const value = (message as Record<string, number>)[field]!;
    fields[field] = type === 'i32' ? value | 0 : (value >>> 0) % 2 ** (8 * FIELD_BYTES[type]);
  }
  return fields;
}
