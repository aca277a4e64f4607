import type { Preflight } from '../../server/session/preflight.js';
import type {
  BenchTold,
  GuideTold,
  PortsTold,
  RigTold,
  TriedTold,
} from '../../server/web/rig/rigMessages.js';
import { ask } from './ask.js';

type Answers = Readonly<Record<string, number | string>>;

export const rigApi = {
  rig: () => ask<RigTold>('GET', '/api/rig'),
  ports: () => ask<PortsTold>('GET', '/api/rig/ports'),
  bench: (after: number) => ask<BenchTold>('GET', `/api/rig/bench?after=${after}`),
  attempt: (wish: { output: string; widthMs: number; into: 'vial' | 'spout' }) =>
    ask<TriedTold>('POST', '/api/rig/try', wish),
  guide: () => ask<GuideTold>('GET', '/api/rig/guide'),
  begin: (guide: string, of: string) => ask<GuideTold>('POST', '/api/rig/guide', { guide, of }),
  lastPreflight: () => ask<{ preflight: Preflight | null }>('GET', '/api/rig/preflight'),
  preflight: () => ask<GuideTold>('POST', '/api/rig/preflight', {}),
  answer: (number: number, answers: Answers) =>
    ask<GuideTold>('POST', '/api/rig/guide/answer', { number, answers }),
  stop: () => ask<unknown>('DELETE', '/api/rig/guide'),
  use: (name: string) => ask<unknown>('POST', '/api/rig/calibrations/use', { name }),
};
export type RigApi = typeof rigApi;
