/**
 * Reads an Intel HEX file ("Hexadecimal Object File Format Specification", revision A, 1988: data,
 * end of file, extended segment and extended linear address records).
 * @returns flash memory as 16-bit words, erased (0xFFFF) where the file says nothing
 */
export function parseHex(text: string, words: number): Uint16Array {
  const memory = new Uint16Array(words).fill(0xffff);
  const bytes = new Uint8Array(memory.buffer);
  let base = 0;
  let ended = false;
  text.split(/\r?\n/).forEach((line, index) => {
    if (line === '') return;
    const fail = (why: string): never => {
      throw new Error(`line ${index + 1} of the .hex file: ${why}`);
    };
    if (!/^:([0-9A-Fa-f]{2}){5,}$/.test(line)) fail('this is no record');
    const record = Buffer.from(line.slice(1), 'hex');
    if ((record.reduce((sum, byte) => sum + byte, 0) & 0xff) !== 0) fail('its checksum is wrong');
    const length = record[0]!;
    if (record.length !== length + 5) fail(`it says ${length} bytes and has ${record.length - 5}`);
    const address = record.readUInt16BE(1);
    const data = record.subarray(4, 4 + length);
    const type = record[3]!;
    if (type === 0) {
      if (base + address + length > bytes.length) fail('it lies beyond the memory');
      bytes.set(data, base + address);
    } else if (type === 1) ended = true;
    else if (type === 2) base = data.readUInt16BE(0) * 16;
    else if (type === 4) base = data.readUInt16BE(0) * 0x1_0000;
    else if (type !== 3 && type !== 5) fail(`its type is ${type}`);
  });
  if (!ended) throw new Error('the .hex file has no end record: it was cut short');
  return memory;
}
