import { LapwingError } from '../errors/codes.js';

const NEWLINE = 10;

/**
 * Cuts a byte stream into lines of text, whatever pieces it comes in. A line longer than `capBytes`
 * throws, so that a peer that never ends its line cannot fill the memory.
 */
export class LineReader {
  private readonly pieces: Buffer[] = [];
  private held = 0;

  constructor(
    private readonly capBytes: number,
    private readonly onLine: (line: string) => void,
  ) {}

  /** Takes the next bytes; calls back once for each line that they complete. Empty lines are skipped. */
  push(bytes: Buffer): void {
    let from = 0;
    for (;;) {
      const end = bytes.indexOf(NEWLINE, from);
      const upTo = end < 0 ? bytes.length : end;
      if (this.held + upTo - from > this.capBytes) {
        throw new LapwingError('loopGarbled', `A line is longer than ${this.capBytes} bytes.`);
      }
      if (end < 0) break;
      this.emit(bytes.subarray(from, end));
      from = end + 1;
    }
    if (from < bytes.length) {
      // A copy: the socket may reuse its buffer, and a slice would keep the whole of it alive.
      this.pieces.push(Buffer.from(bytes.subarray(from)));
      this.held += bytes.length - from;
    }
  }

  /** Forgets a line that was begun: the connection that it came over is gone. */
  reset(): void {
    this.pieces.length = 0;
    this.held = 0;
  }

  private emit(last: Buffer): void {
    let line = last;
    if (this.pieces.length > 0) {
      this.pieces.push(last);
      line = Buffer.concat(this.pieces);
      this.reset();
    }
    // Decoded as a whole line, so a character cut between two pieces comes out right.
    const text = line.toString('utf8').trim();
    if (text !== '') this.onLine(text);
  }
}
