import type { LapwingError } from '../../server/errors/codes.js';
import type { LinkHandler, LinkUp } from '../../server/link/linkHandler.js';
import type { MessageOf } from '../../server/wire/messages.js';

interface Details {
  sample: { message: MessageOf['sample'] };
  edge: { message: MessageOf['edge'] };
  outcome: { message: MessageOf['outcome'] };
  fault: { message: MessageOf['fault'] };
  clock: { message: MessageOf['clock'] };
  up: { event: LinkUp };
  down: { why: LapwingError };
  waiting: { why: LapwingError; retryMs: number };
  gap: { frames: number };
  bad: { why: string };
  batch: object;
}
type What = keyof Details;
type HeardOf<W extends What> = { what: W } & Details[W];
export type Heard = { [W in What]: HeardOf<W> }[What];

/** A handler that keeps a copy of everything it is told. */
export class Recorder implements LinkHandler {
  readonly heard: Heard[] = [];
  onUp: (event: LinkUp) => void = () => {};
  onSample: (message: MessageOf['sample']) => void = () => {};

  of<W extends What>(what: W): HeardOf<W>[] {
    return this.heard.filter((item) => item.what === what) as HeardOf<W>[];
  }
  get batches(): number {
    return this.of('batch').length;
  }
  /** Board messages in order, without the batch ends. */
  get messages() {
    return this.heard.filter((item) => 'message' in item);
  }

  sample(message: MessageOf['sample']): void {
    this.heard.push({ what: 'sample', message: { ...message } });
    this.onSample(message);
  }
  edge(message: MessageOf['edge']): void {
    this.heard.push({ what: 'edge', message: { ...message } });
  }
  outcome(message: MessageOf['outcome']): void {
    this.heard.push({ what: 'outcome', message: { ...message } });
  }
  fault(message: MessageOf['fault']): void {
    this.heard.push({ what: 'fault', message: { ...message } });
  }
  clock(message: MessageOf['clock']): void {
    this.heard.push({ what: 'clock', message: { ...message } });
  }
  up(event: LinkUp): void {
    this.heard.push({ what: 'up', event });
    this.onUp(event);
  }
  down(why: LapwingError): void {
    this.heard.push({ what: 'down', why });
  }
  waiting(why: LapwingError, retryMs: number): void {
    this.heard.push({ what: 'waiting', why, retryMs });
  }
  gap(frames: number): void {
    this.heard.push({ what: 'gap', frames });
  }
  badFrame(why: string): void {
    this.heard.push({ what: 'bad', why });
  }
  batchEnd(): void {
    this.heard.push({ what: 'batch' });
  }
}
