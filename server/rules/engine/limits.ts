import type { RuleState } from './ruleState.js';
import type { State } from './state.js';

/** Whether every limit of a rule leaves room for one more firing now. */
export function limitsAllow(s: State, r: RuleState): boolean {
  return limitMet(s, r) < 0;
}

/** The first limit of a rule that leaves no room for one more firing now; -1 when all do. */
export function limitMet(s: State, r: RuleState): number {
  const { caps } = r.spec;
  if (caps.length === 0) return -1;
  const real = s.tallies[r.spec.realTally]!;
  const sham = s.tallies[r.spec.shamTally]!;
  for (let n = 0; n < caps.length; n++) {
    const cap = caps[n]!;
    let room: boolean;
    switch (cap.kind) {
      case 'lap':
        room = real.thisLap() + sham.thisLap() < cap.count(s);
        break;
      case 'phase':
        room = real.thisPhase() + sham.thisPhase() < cap.count(s);
        break;
      case 'cell':
        room = real.thisCell() + sham.thisCell() < cap.count(s);
        break;
      case 'session':
        room = real.total + sham.total < cap.count(s);
        break;
      case 'window': {
        const sinceUs = s.nowUs - cap.timeUs(s);
        room = real.since(sinceUs) + sham.since(sinceUs) < cap.count(s);
        break;
      }
      case 'apart time':
        room = s.nowUs - r.lastUs >= cap.timeUs(s);
        break;
      case 'apart laps':
        room = s.lap - r.lastLap >= cap.laps(s);
        break;
    }
    if (!room) return n;
  }
  return -1;
}
