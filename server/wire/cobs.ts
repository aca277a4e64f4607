/**
 * Consistent Overhead Byte Stuffing (S. Cheshire, M. Baker, IEEE/ACM Transactions on Networking,
 * 1999): the encoded bytes hold no zero, so that a zero can end a frame.
 */

/** The most bytes that `length` bytes take once encoded, without the delimiter. */
export function cobsBound(length: number): number {
  return length + Math.floor(length / 254) + 1;
}

/**
 * Encodes `source[0..length)` into `target` from `offset`, without a delimiter.
 * @returns the offset behind the last byte written
 */
export function cobsEncode(
  source: Uint8Array,
  length: number,
  target: Uint8Array,
  offset = 0,
): number {
  let codeAt = offset;
  let write = offset + 1;
  let code = 1;
  for (let i = 0; i < length; i++) {
    const byte = source[i]!;
    if (byte !== 0) {
      target[write++] = byte;
      code++;
      // A full block is closed only when more follows, as in the paper: 254 bytes without a zero
      // take 255, not 256.
      if (code === 0xff && i + 1 < length) {
        target[codeAt] = code;
        codeAt = write++;
        code = 1;
      }
    } else {
      target[codeAt] = code;
      codeAt = write++;
      code = 1;
    }
  }
  target[codeAt] = code;
  return write;
}

/**
 * Decodes `buffer[0..length)` (no delimiter inside) in place.
 * @returns the decoded length, or -1 when the code bytes do not add up
 */
export function cobsDecodeInPlace(buffer: Uint8Array, length: number): number {
  let read = 0;
  let write = 0;
  while (read < length) {
    const code = buffer[read++]!;
    if (code === 0) return -1;
    const end = read + code - 1;
    if (end > length) return -1;
    while (read < end) {
      const byte = buffer[read++]!;
      if (byte === 0) return -1;
      buffer[write++] = byte;
    }
    if (code !== 0xff && read < length) buffer[write++] = 0;
  }
  return write;
}
