/**
 * CRC-16/CCITT-FALSE (catalogue name CRC-16/IBM-3740): polynomial 0x1021, initial value 0xFFFF,
 * no reflection, no final XOR.
 */
const TABLE = new Uint16Array(256);
for (let byte = 0; byte < 256; byte++) {
  let crc = byte << 8;
  for (let bit = 0; bit < 8; bit++) crc = crc & 0x8000 ? (crc << 1) ^ 0x1021 : crc << 1;
  TABLE[byte] = crc;
}

/** The CRC of `bytes[start..end)`, an integer from 0 to 0xFFFF. */
export function crc16(bytes: Uint8Array, start = 0, end = bytes.length): number {
  let crc = 0xffff;
  for (let i = start; i < end; i++) {
    crc = ((crc << 8) ^ TABLE[(crc >> 8) ^ bytes[i]!]!) & 0xffff;
  }
  return crc;
}
