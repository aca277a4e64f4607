/** A board under test: a line of bytes, and time that passes. What only a bench can do is optional. */
export interface BoardLine {
  readonly name: string;
  /** `wait` goes by a clock that the board does not share. */
  readonly realTime?: true;
  write(bytes: Uint8Array): void;
  /** Set by whoever listens. */
  heard: (bytes: Uint8Array) => void;
  /** Lets so much time pass, and hands over what the board says meanwhile. */
  wait(us: number): Promise<void>;
  /** Turns the encoder by so many counts, at this rate. Absent: nothing turns it. */
  turn?(counts: number, countsPerS: number): Promise<void>;
  /** Both encoder lines change at once. */
  jump?(): void;
  setInput?(input: number, level: 0 | 1): void;
  /** The level at an output's pin. */
  pin?(output: number): 0 | 1;
}
