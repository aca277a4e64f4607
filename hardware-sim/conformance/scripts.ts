import type { ConformanceHost } from './conformanceHost.js';
import { connectionScripts } from './connectionScripts.js';
import { pulseScripts } from './pulseScripts.js';
import { slotScripts } from './slotScripts.js';

/** One thing that WIRE.md asks of a board, as frames to send and answers to expect. */
export interface Script {
  readonly name: string;
  /** The rules of WIRE.md, "What the board does", that it looks at. */
  readonly rules: string;
  /** What the bench must be able to do beyond speaking and waiting. */
  readonly needs?: readonly ('turn' | 'jump' | 'setInput' | 'pin')[];
  run(host: ConformanceHost): Promise<void>;
}

/** The suite, in the order in which a report tells it. */
export const SCRIPTS: readonly Script[] = [...connectionScripts, ...pulseScripts, ...slotScripts];
