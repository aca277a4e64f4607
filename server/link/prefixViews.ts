/**
 * Views of the first bytes of one buffer, made once for each length: a port hands on a view for
 * every read, a thousand times a second, and should leave no garbage behind.
 */
export class PrefixViews {
  readonly buffer: Buffer;
  readonly #views: (Buffer | undefined)[];

  constructor(bytes: number) {
    this.buffer = Buffer.alloc(bytes);
    this.#views = new Array(bytes + 1).fill(undefined);
  }

  of(length: number): Buffer {
    this.#views[length] ??= this.buffer.subarray(0, length);
    return this.#views[length];
  }
}
